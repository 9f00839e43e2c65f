# SPDX-License-Identifier: BSL-1.0
# What a user pays to compile: preprocessed lines of the two usual doors, which do not wobble as seconds do.
# Given: ROOT, the project; COMPILER, GCC.
cmake_policy(VERSION 3.22)
set(budget_core 70000)
set(budget_steelyard 165000)

set(faults "")
foreach(door IN ITEMS core steelyard)
  set(header "${ROOT}/include/steelyard/${door}.hpp")
  if(NOT EXISTS "${header}")
    message(FATAL_ERROR "cost: ${header} is missing")
  endif()
  execute_process(
    COMMAND "${COMPILER}" -std=c++20 -E -P "-I${ROOT}/include" -include "${header}" -x c++ /dev/null
    COMMAND wc -l
    OUTPUT_VARIABLE lines
    RESULTS_VARIABLE results
    OUTPUT_STRIP_TRAILING_WHITESPACE)
  if(NOT results STREQUAL "0;0")
    message(FATAL_ERROR "cost: ${header} cannot be preprocessed")
  endif()
  string(STRIP "${lines}" lines)
  message("${door}.hpp: ${lines} preprocessed lines, ${budget_${door}} at most")
  if(lines GREATER budget_${door} OR lines LESS 100)
    string(APPEND faults "\n  ${door}.hpp: ${lines} lines, ${budget_${door}} at most")
  endif()
endforeach()
if(faults)
  message(FATAL_ERROR "cost:${faults}")
endif()
