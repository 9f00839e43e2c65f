# SPDX-License-Identifier: BSL-1.0
# One program that must not compile: SOURCE, <entry>_<mistake>.cpp, whose first line is `// expect: <words>`. Shown here:
#   its twin <entry>_<mistake>.legal.cpp, the same without the mistake, compiles without a warning;
#   SOURCE does not compile, and the first line with `error:` holds the words;
#   the whole message is at most 12 lines. Counted is every line that the compiler prints, "In file included from", "required
#   from" and notes too, with excerpts of source and carets switched off; left out is only Clang's closing "1 error generated.".
# Given: COMPILER, ID (GNU or Clang), INCLUDES (a list of -I flags), SOURCE.
set(most_lines 12)
set(ENV{LC_ALL} C)  # messages in English, with plain quotes

set(flags -std=c++20 -Wall -Wextra -Wpedantic -Wconversion -Wsign-conversion -Wshadow -fsyntax-only ${INCLUDES})
if(ID STREQUAL "GNU")
  list(APPEND flags -fno-diagnostics-show-caret -fdiagnostics-color=never -fmessage-length=0)
else()
  list(APPEND flags -fno-caret-diagnostics -fno-color-diagnostics -fno-diagnostics-fixit-info)
endif()

file(READ "${SOURCE}" text)
if(NOT text MATCHES "^// expect: ([^\n]+)\n")
  message(FATAL_ERROR "${SOURCE}: the first line must be `// expect: <words of the message>`")
endif()
string(STRIP "${CMAKE_MATCH_1}" words)

string(REGEX REPLACE "\\.cpp$" ".legal.cpp" twin "${SOURCE}")
if(NOT EXISTS "${twin}")
  message(FATAL_ERROR "${SOURCE}: there is no legal twin ${twin}")
endif()
execute_process(COMMAND "${COMPILER}" ${flags} -Werror "${twin}" RESULT_VARIABLE result ERROR_VARIABLE said)
if(NOT result EQUAL 0)
  message("${said}")
  message(FATAL_ERROR "${twin}: the legal twin does not compile")
endif()

execute_process(COMMAND "${COMPILER}" ${flags} "${SOURCE}" RESULT_VARIABLE result ERROR_VARIABLE said)
message("${said}")
if(result EQUAL 0)
  message(FATAL_ERROR "${SOURCE}: compiles, but must not")
endif()
if(NOT said MATCHES "error:[^\n]*")
  message(FATAL_ERROR "${SOURCE}: the compiler failed without an error message")
endif()
set(first_error "${CMAKE_MATCH_0}")
string(FIND "${first_error}" "${words}" place)
if(place EQUAL -1)
  message(FATAL_ERROR "${SOURCE}: the first error does not hold the words `${words}`:\n${first_error}")
endif()
string(REGEX REPLACE "\n[0-9]+ (error|warning)[^\n]* generated\\.\n" "\n" counted "${said}")
string(REGEX MATCHALL "\n" lines "${counted}")
list(LENGTH lines count)
if(count GREATER most_lines)
  message(FATAL_ERROR "${SOURCE}: the message is ${count} lines long, ${most_lines} at most are allowed")
endif()
message("${count} lines")
