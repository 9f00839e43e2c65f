# SPDX-License-Identifier: BSL-1.0
# shellcheck shell=bash
# Set-up shared by examples/run and tests/run (sourced, bash 3.2 or later): finds what is missing by compiling an include, and
# installs it on the Debian family where it may; elsewhere it prints what to type and stops.
#
#   steelyard_setup core|tests     needs for the examples, or for the tests as well
#   steelyard_generator            sets the array generator to CMake's -G, Ninja where there is one
#   $root                          given: the project's folder
#   $CXX                           the compiler, if another than the first of g++, c++, clang++ is wanted

# Where there is a ccache, let it know the files of another copy of this tree again.
export CCACHE_BASEDIR=${CCACHE_BASEDIR-$root} CCACHE_NOHASHDIR=${CCACHE_NOHASHDIR-1}

say() { printf '%s\n' "$*"; }
step() { printf '\n== %s\n' "$*"; }

cores() { nproc 2>/dev/null || getconf _NPROCESSORS_ONLN 2>/dev/null || echo 2; }

have() { command -v "$1" >/dev/null 2>&1; }

# The first compiler that takes C++20 as this library writes it: g++, then what the system calls c++, then clang++.
find_compiler() {
  local candidate
  for candidate in ${CXX:+"$CXX"} g++ c++ clang++; do
    if have "$candidate" && compiles "$candidate" '#include <concepts>' '#include <span>' '#include <stop_token>' \
      '#if defined(__clang__) ? __clang_major__ < 14 : __GNUC__ < 12' '#error "too old"' '#endif' \
      'template <class T> concept narrow = sizeof(T) < 9;' 'int main() { std::stop_source s; return narrow<char> ? 0 : 1; }'; then
      compiler=$candidate
      return 0
    fi
  done
  compiler=
  return 1
}

# compiles COMPILER LINE...: whether these lines are a C++20 program, as far as the compiler's front end goes.
compiles() {
  local with=$1 extra=()
  shift
  # A package manager outside the compiler's own folders.
  if have brew; then extra=(-I"$(brew --prefix)/include"); fi
  printf '%s\n' "$@" | "$with" -std=c++20 -fsyntax-only ${extra[@]+"${extra[@]}"} -x c++ - >/dev/null 2>&1
}

# includes HEADER [CONDITION]: whether the header is there and, as preprocessor text, the condition holds.
includes() { compiles "$compiler" "#include <$1>" "#if !(${2:-1})" '#error "too old"' '#endif' 'int main() {}'; }

cmake_is_there() {
  local version major minor
  have cmake || return 1
  version=$(cmake --version 2>/dev/null | head -n 1)
  version=${version##* }
  major=${version%%.*}
  minor=${version#*.}
  minor=${minor%%.*}
  [ "$major" -gt 3 ] 2>/dev/null || { [ "$major" -eq 3 ] && [ "$minor" -ge 22 ]; } 2>/dev/null
}

# Sets the array missing to the names of what is not there; headers can be asked for only where there is a compiler.
find_missing() {
  missing=()
  find_compiler || missing+=(compiler)
  cmake_is_there || missing+=(cmake)
  have ninja || have make || missing+=(ninja)
  if [ "$1" = tests ]; then have pkgconf || have pkg-config || missing+=(pkg-config); fi
  [ -n "$compiler" ] || return 0
  includes boost/version.hpp 'BOOST_VERSION >= 107400' || missing+=(boost)
  includes xtensor/xtensor.hpp || includes xtensor/containers/xtensor.hpp || missing+=(xtensor)
  if [ "$1" = tests ]; then
    includes doctest/doctest.h || missing+=(doctest)
    includes benchmark/benchmark.h || missing+=(benchmark)
    includes gtest/gtest.h || missing+=(googletest)
  fi
}

# package MANAGER NAME: what the manager calls it.
package() {
  case "$1:$2" in
    apt:compiler) echo g++ ;;
    dnf:compiler) echo gcc-c++ ;;
    pacman:compiler | brew:compiler) echo gcc ;;
    *:cmake) echo cmake ;;
    apt:ninja | dnf:ninja) echo ninja-build ;;
    *:ninja) echo ninja ;;
    apt:boost) echo libboost-dev ;;
    dnf:boost) echo boost-devel ;;
    *:boost) echo boost ;;
    apt:xtensor) echo libxtensor-dev ;;
    dnf:xtensor) echo xtensor-devel ;;
    *:xtensor) echo xtensor ;;
    apt:doctest) echo doctest-dev ;;
    dnf:doctest) echo doctest-devel ;;
    *:doctest) echo doctest ;;
    apt:benchmark) echo libbenchmark-dev ;;
    dnf:benchmark) echo google-benchmark-devel ;;
    brew:benchmark) echo google-benchmark ;;
    *:benchmark) echo benchmark ;;
    apt:googletest) echo libgtest-dev ;;
    dnf:googletest) echo gtest-devel ;;
    pacman:googletest) echo gtest ;;
    brew:googletest) echo googletest ;;
    apt:pkg-config) echo pkg-config ;;
    dnf:pkg-config) echo pkgconf-pkg-config ;;
    *:pkg-config) echo pkgconf ;;
  esac
}

packages() {
  local manager=$1 name line=
  for name in "${missing[@]}"; do line="$line $(package "$manager" "$name")"; done
  echo "${line# }"
}

tell_how() {
  if [ -z "$compiler" ]; then
    # No header could be tried; the line names all that may be needed.
    missing+=(boost xtensor)
    if [ "$1" = tests ]; then missing+=(doctest benchmark googletest); fi
  fi
  say "Missing: ${missing[*]}. Install with the line for this system, and start again:"
  say "  Debian, Ubuntu   sudo apt-get update && sudo apt-get install -y $(packages apt)"
  say "  Fedora           sudo dnf install -y $(packages dnf)"
  say "  Arch             sudo pacman -S --needed $(packages pacman)"
  say "  macOS            brew install $(packages brew)"
  for name in "${missing[@]}"; do
    case $name in
      compiler) say "compiler means one for C++20: GCC 12 or later, or Clang 14 or later." ;;
      cmake) say "CMake is needed in version 3.22 or later." ;;
      boost) say "Boost is needed in version 1.74 or later." ;;
    esac
  done
}

# The Debian family, and root or a sudo that answers. Sets the array as_root.
may_install() {
  have apt-get && [ -e /etc/debian_version ] || return 1
  as_root=()
  [ "$(id -u)" -eq 0 ] && return 0
  have sudo || return 1
  if [ -t 0 ]; then as_root=(sudo); else as_root=(sudo -n); fi
  "${as_root[@]}" true 2>/dev/null
}

install_missing() {
  local wanted
  wanted=$(packages apt)
  step "installing $wanted"
  # env stands behind sudo, which drops the environment.
  ${as_root[@]+"${as_root[@]}"} env DEBIAN_FRONTEND=noninteractive apt-get update || return 1
  # shellcheck disable=SC2086
  ${as_root[@]+"${as_root[@]}"} env DEBIAN_FRONTEND=noninteractive apt-get install -y --no-install-recommends $wanted
}

steelyard_setup() {
  local round
  step "looking for what is needed"
  find_missing "$1"
  # Twice where there is no compiler at first: a header that is there already may belong to a package that another one would
  # drive out (libboost1.81-dev and libboost-dev), so none is installed before it was tried.
  for round in tools headers; do
    if [ ${#missing[@]} -gt 0 ] && may_install; then
      install_missing || say "apt-get could not install the $round."
      find_missing "$1"
    fi
  done
  if [ ${#missing[@]} -gt 0 ]; then
    tell_how "$1"
    return 1
  fi
  say "compiler: $("$compiler" --version | head -n 1)"
  say "cmake:    $(cmake --version | head -n 1)"
}

steelyard_generator() {
  if have ninja; then generator=(-G Ninja); else generator=(-G "Unix Makefiles"); fi
  if have brew; then generator+=("-DCMAKE_PREFIX_PATH=$(brew --prefix)"); fi
}
