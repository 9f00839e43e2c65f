# SPDX-License-Identifier: BSL-1.0
# Configures and builds the project SOURCE in BINARY from nothing, and runs each of its PROGRAMS, which must return 0.
file(REMOVE_RECURSE "${BINARY}")

function(step what)
  execute_process(COMMAND ${ARGN} RESULT_VARIABLE result OUTPUT_VARIABLE said ERROR_VARIABLE said)
  if(NOT result EQUAL 0)
    message("${said}")
    message(FATAL_ERROR "${SOURCE}: could not ${what}")
  endif()
endfunction()

list(PREPEND PACKAGES "${PREFIX}")
string(REPLACE ";" "\\;" PACKAGES "${PACKAGES}")
step(configure "${CMAKE_COMMAND}" -S "${SOURCE}" -B "${BINARY}" -G "${GENERATOR}" -DCMAKE_BUILD_TYPE=Release
     "-DCMAKE_CXX_FLAGS_RELEASE=-O2 -DNDEBUG" "-DCMAKE_CXX_COMPILER=${COMPILER}" "-DCMAKE_CXX_COMPILER_LAUNCHER=${LAUNCHER}"
     "-DCMAKE_PREFIX_PATH=${PACKAGES}" "-DSTEELYARD_ROOT=${STEELYARD_ROOT}" "-DWERROR=${WERROR}")
step(build "${CMAKE_COMMAND}" --build "${BINARY}")
foreach(program IN LISTS PROGRAMS)
  step("run ${program}" "${BINARY}/${program}")
endforeach()
