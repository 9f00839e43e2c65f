# SPDX-License-Identifier: BSL-1.0
# The first ```cpp block of the README is first.cpp without its licence line, and the first ```text block behind it is
# what that program prints.
# Given: README, SOURCE, PROGRAM, EXACT (whether the output must agree to the digit).
cmake_policy(VERSION 3.22)
file(READ "${README}" readme)
file(READ "${SOURCE}" source)

# The lines between a fence of this language and the next fence, looked for behind `from`.
function(fenced language text result rest)
  string(FIND "${text}" "\n```${language}\n" start)
  if(start EQUAL -1)
    message(FATAL_ERROR "readme: there is no ```${language} block in ${README}")
  endif()
  string(LENGTH "\n```${language}\n" skip)
  math(EXPR start "${start} + ${skip}")
  string(SUBSTRING "${text}" ${start} -1 text)
  string(FIND "${text}" "```\n" end)
  string(SUBSTRING "${text}" 0 ${end} inside)
  string(SUBSTRING "${text}" ${end} -1 text)
  set(${result} "${inside}" PARENT_SCOPE)
  set(${rest} "${text}" PARENT_SCOPE)
endfunction()

fenced(cpp "${readme}" code readme)
fenced(text "${readme}" output readme)
string(REPLACE "// SPDX-License-Identifier: BSL-1.0\n" "" program "${source}")
if(NOT code STREQUAL program)
  message(FATAL_ERROR "readme: the program in ${README} is not ${SOURCE}")
endif()
execute_process(COMMAND "${PROGRAM}" RESULT_VARIABLE code OUTPUT_VARIABLE said)
if(NOT code EQUAL 0)
  message(FATAL_ERROR "readme: ${PROGRAM} returned ${code}")
endif()
if(EXACT AND NOT said STREQUAL output)
  message(FATAL_ERROR "readme: the program prints\n${said}and README.md says\n${output}")
endif()
