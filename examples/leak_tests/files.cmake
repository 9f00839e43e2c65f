# SPDX-License-Identifier: BSL-1.0
# What the leak example does with wrong files and wrong command lines: one line on standard error that names what is
# wrong, nothing on standard output, an exit code above zero, and no file of states, whole or half.
# Given: PROGRAM, READINGS. Works in the current directory.
cmake_policy(VERSION 3.22)
set(cases 0)
set(faults "")
set(states "states.csv")

# refused(CODE WORDS ARGUMENT...): the program, with these arguments, says WORDS and returns CODE.
function(refused code words)
  file(REMOVE "${states}" "${states}.part")
  execute_process(COMMAND "${PROGRAM}" ${ARGN} RESULT_VARIABLE returned OUTPUT_VARIABLE out ERROR_VARIABLE err)
  math(EXPR cases "${cases} + 1")
  set(cases ${cases} PARENT_SCOPE)
  set(trouble "")
  if(NOT returned STREQUAL code)
    string(APPEND trouble " returned ${returned}, not ${code};")
  endif()
  if(NOT out STREQUAL "")
    string(APPEND trouble " something on standard output;")
  endif()
  string(FIND "${err}" "${words}" found)
  if(found EQUAL -1)
    string(APPEND trouble " does not say it;")
  endif()
  string(REGEX MATCHALL "\n" ends "${err}")
  list(LENGTH ends lines)
  if(NOT lines EQUAL 1 OR NOT err MATCHES "^leak: .*\n$")
    string(APPEND trouble " not one line;")
  endif()
  if(EXISTS "${states}" OR EXISTS "${states}.part")
    string(APPEND trouble " a file was left;")
  endif()
  if(trouble)
    set(faults "${faults}\n  '${words}':${trouble} it said: ${err}" PARENT_SCOPE)
  endif()
endfunction()

# wrong(WORDS TEXT): the same for a file that holds TEXT.
function(wrong words text)
  file(WRITE wrong.csv "${text}")
  refused(1 "${words}" wrong.csv --states "${states}")
  set(cases ${cases} PARENT_SCOPE)
  set(faults "${faults}" PARENT_SCOPE)
endfunction()

set(header "instrument,position_m,reading,unit\n")
set(one "logger 1,450,567.9,kPa\n")
set(two "logger 2,1150,497.2,kPa\n")
set(meter "make-up meter,0,2.46,L/s\n")

wrong("wrong.csv: the file is empty" "")
wrong("wrong.csv: the file is empty" "# nothing but a comment\n")
wrong("wrong.csv: there is a header but no row behind it" "${header}")
wrong("wrong.csv: the column 'reading' is missing; there are 'instrument', 'position_m', 'unit'"
      "instrument,position_m,unit\nlogger 1,450,kPa\n")
wrong("wrong.csv: the column 'instrument' is missing"
      "instrument\;position_m\;reading\;unit\nlogger 1\;450\;567.9\;kPa\n")
wrong("wrong.csv, line 2: 'high' stands in column 'reading', where a number is due"
      "${header}logger 1,450,high,kPa\n${two}${meter}")
wrong("wrong.csv, line 3: '' stands in column 'position_m', where a number is due"
      "${header}${one}logger 2,,497.2,kPa\n${meter}")
wrong("wrong.csv, line 4: 'nan' stands in column 'reading', where a number is due"
      "${header}${one}${two}make-up meter,0,nan,L/s\n")
wrong("wrong.csv, line 2: fields in this row: 5, columns in the header: 4"
      "${header}logger 1,450,567,9,kPa\n${two}${meter}")
wrong("wrong.csv, line 2: a reading of 1567.9 is off the scale of logger 1, which runs from 0 to 1000 kPa"
      "${header}logger 1,450,1567.9,kPa\n${two}${meter}")
wrong("wrong.csv, line 4: a reading of -0.1 is off the scale of make-up meter, which runs from 0 to 10 L/s"
      "${header}${one}${two}make-up meter,0,-0.1,L/s\n")
wrong("wrong.csv, line 3: a position of 1201 m is off the main" "${header}${one}logger 2,1201,497.2,kPa\n${meter}")
wrong("wrong.csv, line 2: logger 1 reads in kPa, not in 'bar'" "${header}logger 1,450,5.679,bar\n${two}${meter}")
wrong("wrong.csv, line 5: there is no instrument 'logger 3'" "${header}${one}${two}${meter}logger 3,700,550.0,kPa\n")
wrong("wrong.csv, line 3: logger 1 was read already in line 2" "${header}${one}${one}${two}${meter}")
wrong("wrong.csv: there is no row for 'make-up meter'" "${header}${one}${two}")
wrong("multiples of 0.1" "${header}logger 1,450,567.93,kPa\n${two}${meter}")
# On the scale, but not of this main: a pressure that no state shows, and one that falls hardly at all on the way.
wrong("wrong.csv, line 2: no state comes within" "${header}logger 1,450,3.0,kPa\n${two}${meter}")
wrong("wrong.csv: hardly any state explains these readings together"
      "${header}logger 1,450,567.9,kPa\nlogger 2,1150,542.0,kPa\nmake-up meter,0,5.9,L/s\n")

refused(1 "nowhere.csv: there is no such file" nowhere.csv --states "${states}")
refused(1 ": this is a folder, not a file" . --states "${states}")
refused(1 "the states cannot be written there" "${READINGS}" --samples 20000 --states no/such/folder.csv)
refused(2 "a file of readings is needed; --help shows" --states "${states}")
refused(2 "--samples takes a whole number from 1 to 1000000000, not 'many'" "${READINGS}" --samples many
        --states "${states}")
refused(2 "there is no option --sample;" "${READINGS}" --sample 3 --states "${states}")
file(COPY_FILE "${READINGS}" kept.csv)
refused(2 "the states would overwrite the readings in kept.csv" kept.csv --states kept.csv)
file(READ "${READINGS}" before)
file(READ kept.csv after)
if(NOT before STREQUAL after)
  string(APPEND faults "\n  the readings were overwritten")
endif()

# A run that fails leaves an older file of states as it was.
file(WRITE older.csv "older\n")
execute_process(COMMAND "${PROGRAM}" wrong.csv --states older.csv RESULT_VARIABLE returned OUTPUT_QUIET ERROR_QUIET)
file(READ older.csv text)
if(returned EQUAL 0 OR NOT text STREQUAL "older\n")
  string(APPEND faults "\n  an older file of states was touched by a run that failed")
endif()

# A right run: 200 states and a header, nothing left over, and the same file whatever the threads.
foreach(threads IN ITEMS 1 2)
  execute_process(COMMAND "${PROGRAM}" --readings "${READINGS}" --samples 100000 --threads ${threads}
                          --states right_${threads}.csv
                  RESULT_VARIABLE returned OUTPUT_VARIABLE out ERROR_VARIABLE err)
  if(NOT returned EQUAL 0 OR NOT err STREQUAL "" OR NOT out MATCHES "Can this be believed"
     OR EXISTS right_${threads}.csv.part)
    string(APPEND faults "\n  a right file with ${threads} threads: returned ${returned}, ${err}")
  endif()
  file(STRINGS right_${threads}.csv rows)
  list(LENGTH rows length)
  if(NOT length EQUAL 201)
    string(APPEND faults "\n  ${length} lines of states, not 201")
  endif()
endforeach()
file(READ right_1.csv first)
file(READ right_2.csv second)
if(NOT first STREQUAL second)
  string(APPEND faults "\n  one and two threads gave other states")
endif()
# The same readings as another program may write them: a byte order mark, other columns and order, quotes, CR LF.
string(ASCII 239 187 191 mark)
file(WRITE other.csv "${mark}unit,reading,note,position_m,instrument\r\n"
                     "\"L/s\",2.46,\"at night, steady\",0,make-up meter\r\n"
                     "kPa,4.972e2,,1150.0,logger 2\r\nkPa,567.9,,450,\"logger 1\"\r\n")
execute_process(COMMAND "${PROGRAM}" other.csv --samples 100000 --states right_2.csv
                RESULT_VARIABLE returned OUTPUT_QUIET)
file(READ right_2.csv second)
if(NOT returned EQUAL 0 OR NOT first STREQUAL second)
  string(APPEND faults "\n  the same readings in another file gave other states")
endif()

if(faults)
  message(FATAL_ERROR "leak example:${faults}")
endif()
message("${cases} wrong files and command lines, each refused in one line")
