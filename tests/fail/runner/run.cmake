# SPDX-License-Identifier: BSL-1.0
# The runner must turn SOURCE down, for the reason that its line `// runner: <words>` gives.
file(STRINGS "${SOURCE}" lines REGEX "^// runner: ")
list(GET lines 0 line)
string(REGEX REPLACE "^// runner: " "" reason "${line}")
execute_process(
  COMMAND "${CMAKE_COMMAND}" "-DCOMPILER=${COMPILER}" "-DID=${ID}" "-DINCLUDES=${INCLUDES}" "-DSOURCE=${SOURCE}" -P
          "${CMAKE_CURRENT_LIST_DIR}/../run.cmake"
  RESULT_VARIABLE result
  ERROR_VARIABLE said)
string(REGEX REPLACE "[ \n]+" " " said "${said}")
string(FIND "${said}" "${reason}" place)
if(result EQUAL 0 OR place EQUAL -1)
  message("${said}")
  message(FATAL_ERROR "${SOURCE}: the runner had to say `${reason}` and fail")
endif()
