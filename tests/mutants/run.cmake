# SPDX-License-Identifier: BSL-1.0
# Applies the mutant NAME of list.cmake to a copy of the headers, compiles the test that must notice it, and passes only
# where that test runs and fails. A mutant whose text is not found exactly once, or that does not compile, is an error
# here: such a mutant proves nothing.
# Given: ROOT, the project; LIST, the file with the mutants; NAME; BINARY, a folder of our own; COMPILER; LAUNCHER;
# INCLUDES, flags; MAIN, a library with doctest's main.
cmake_policy(VERSION 3.22)

set(found "")
# mutant(name file test BREAKS from to): `from` in include/steelyard/file becomes `to`; tests/`test` must fail.
function(mutant name file test breaks from to)
  if(NOT name STREQUAL NAME)
    return()
  endif()
  set(found ON PARENT_SCOPE)
  set(home "${BINARY}/${name}")
  file(REMOVE_RECURSE "${home}")
  file(COPY "${ROOT}/include" DESTINATION "${home}")
  set(header "${home}/include/steelyard/${file}")
  file(READ "${header}" text)
  string(FIND "${text}" "${from}" first)
  string(FIND "${text}" "${from}" last REVERSE)
  if(first EQUAL -1 OR NOT first EQUAL last)
    message(FATAL_ERROR "${name}: the text to be changed does not stand exactly once in ${file}:\n${from}")
  endif()
  string(REPLACE "${from}" "${to}" text "${text}")
  file(WRITE "${header}" "${text}")
  execute_process(
    COMMAND ${LAUNCHER} "${COMPILER}" -std=c++20 -O0 -w "-I${home}/include" ${INCLUDES} "-I${ROOT}/tests"
            "-DSTEELYARD_TEST_DATA=\"${ROOT}/tests/data\"" -c "${ROOT}/tests/${test}" -o "${home}/test.o"
    RESULT_VARIABLE result ERROR_VARIABLE said)
  if(result EQUAL 0)
    execute_process(COMMAND "${COMPILER}" "${home}/test.o" "${MAIN}" -pthread -o "${home}/test" RESULT_VARIABLE result
                    ERROR_VARIABLE said)
  endif()
  if(NOT result EQUAL 0)
    message("${said}")
    message(FATAL_ERROR "${name}: the mutant does not compile with ${test}")
  endif()
  execute_process(COMMAND "${home}/test" --no-intro=true --no-colors=true --abort-after=1 TIMEOUT 300
                  RESULT_VARIABLE result OUTPUT_VARIABLE said ERROR_VARIABLE also)
  file(REMOVE_RECURSE "${home}")
  if(result EQUAL 0)
    message(FATAL_ERROR "${name} survives ${test}: ${breaks}")
  endif()
  # It must fail because a check failed or threw, not because the program could not start.
  if(NOT said MATCHES "TEST CASE: *([^\n]*)")
    message("${said}${also}")
    message(FATAL_ERROR "${name}: ${test} ended with ${result} and named no test case")
  endif()
  message("${name} (${breaks}) is caught by: ${CMAKE_MATCH_1}")
endfunction()

include("${LIST}")
if(NOT found)
  message(FATAL_ERROR "there is no mutant ${NAME} in ${LIST}")
endif()
