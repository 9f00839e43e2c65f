// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <array>
#include <cstddef>
#include <cstdint>
#include <cstring>
#include <span>
#include <string>
#include <tuple>
#include <type_traits>
#include <vector>

#include <steelyard/base/error.hpp>

namespace steelyard::inline v1::detail {

/// Numbers, arrays and vectors of them as bytes, in this machine's own layout.
class byte_writer {
 public:
  template <class T>
    requires std::is_trivially_copyable_v<T>
  void put(T const& value) {
    put_raw(&value, sizeof value);
  }
  template <class T>
  void put(std::vector<T> const& values) {
    static_assert(std::is_trivially_copyable_v<T>, "steelyard: fields() may name numbers, and arrays and vectors of them");
    put(static_cast<std::uint64_t>(values.size()));
    put_raw(values.data(), values.size() * sizeof(T));
  }
  template <class... Ts>
  void put_each(std::tuple<Ts&...> const& fields) {
    std::apply([&](auto const&... each) { (put(each), ...); }, fields);
  }
  void put_raw(void const* data, std::size_t size) {
    std::size_t const at = bytes_.size();
    bytes_.resize(at + size);
    if (size > 0) std::memcpy(bytes_.data() + at, data, size);
  }
  [[nodiscard]] std::vector<std::byte>& bytes() noexcept { return bytes_; }

 private:
  std::vector<std::byte> bytes_;
};

/// Reads what `byte_writer` wrote. @throws bad_checkpoint past the end.
class byte_reader {
 public:
  explicit byte_reader(std::span<std::byte const> bytes) : bytes_(bytes) {}

  template <class T>
    requires std::is_trivially_copyable_v<T>
  void get(T& value) {
    get_raw(&value, sizeof value);
  }
  template <class T>
  void get(std::vector<T>& values) {
    std::uint64_t const size = next<std::uint64_t>();
    if (size > bytes_.size() / sizeof(T)) throw bad_checkpoint("checkpoint: it ends too early; it was cut short or damaged");
    values.resize(static_cast<std::size_t>(size));
    get_raw(values.data(), values.size() * sizeof(T));
  }
  template <class T>
  [[nodiscard]] T next() {
    T value{};
    get(value);
    return value;
  }
  template <class... Ts>
  void get_each(std::tuple<Ts&...> const& fields) {
    std::apply([&](auto&... each) { (get(each), ...); }, fields);
  }
  void get_raw(void* data, std::size_t size) {
    if (size > bytes_.size()) throw bad_checkpoint("checkpoint: it ends too early; it was cut short or damaged");
    if (size > 0) std::memcpy(data, bytes_.data(), size);
    bytes_ = bytes_.subspan(size);
  }
  [[nodiscard]] std::size_t left() const noexcept { return bytes_.size(); }

 private:
  std::span<std::byte const> bytes_;
};

/// FNV-1a of some bytes, to tell a damaged checkpoint.    [Fowler, Noll & Vo; IETF draft-eastlake-fnv]
inline std::uint64_t fingerprint(std::span<std::byte const> bytes) noexcept {
  std::uint64_t hash = 0xcbf29ce484222325u;
  for (std::byte const b : bytes) hash = (hash ^ static_cast<std::uint64_t>(b)) * 0x100000001b3u;
  return hash;
}

}  // namespace steelyard::inline v1::detail
