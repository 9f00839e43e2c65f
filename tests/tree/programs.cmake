# SPDX-License-Identifier: BSL-1.0
# Tests found by globbing pass in silence when their files are gone, so some are named here:
#   tests/contract/  exactly these eight, to the byte: programs that users write are not mended to please the library
#   tests/bits/      exactly these
#   tests/fail/      at least these slips, each with its legal twin
# Given: ROOT, the project.
cmake_policy(VERSION 3.22)

set(contracts
    01_three_steps.cpp c425b2666cb0ee577020093a1276baf46b131d0d3bc4eef7f795bb6a7a2c95d3
    02_one_pass.cpp f136bc6f7c4d6470a56ae52793b8e9573f591b4f598229c718c98b143d6a9975
    03_existing_ensemble.cpp 2587cff10a488cc3aad6e422191d9143bcf43457fcd7d7810acf42fa180e06ea
    04_instruments.cpp 376feb612f402cac968f452d436200b9e08662a5962a9fa80cfc5e801eb3311f
    05_sharp.cpp ee9559481f0c90c0acc9c1a733ca7e4ac3f87c33b4188be5eef0fae8332b1455
    06_test_kit.cpp 2868f7099c94d9bf540a7365a32ccf859a13c3fb136c8a9e9939bc2c47326484
    07_own_estimator.cpp df8f0560410daa8d68c471241d97fdbbdb1e9731f63afb5b1fc30dfe542478a0
    08_embedding.cpp bf276c825c43f52bd4a661ec9e794d77be212ae66fc2bb13637a4d4d90f5e9e9
)
set(bits results.cpp)
set(slips
    bounded_bare_double
    draws_copied_inside
    histogram_without_bins
    own_estimator_fields
    per_worker_without_factory
    pipeline_bare_double
    pipeline_mutable_sampler
    pipeline_mutable_weighter
    pipeline_quantile_in_one_pass
    pipeline_sampler_copies_draws
    pipeline_sampler_without_draws
    pipeline_void_sampler
    pipeline_weighter_of_another_state
    reading_of_a_whole_state
    reading_of_another_state
    reweigh_bare_double
    sample_estimate_of_a_readout
    sample_given_a_number
    sample_probability_of_a_number
    sample_readout_of_another_state
    tempered_bare_double
    tempered_void_sampler
    together_bare_double
    toolbox_correlation_of_text
    toolbox_cumulative_in_one_pass
    toolbox_ensemble_event
    toolbox_histogram_2d_edges
    toolbox_mode_of_text
    toolbox_moments_of_two
    toolbox_shortest_in_one_pass
    until_of_a_readout
    weigh_bare_double)

set(faults "")

# A program that stands in `folder` and is none of those named.
function(refuse_others folder)
  file(GLOB found RELATIVE "${ROOT}/tests/${folder}" "${ROOT}/tests/${folder}/*.cpp")
  foreach(file IN LISTS found)
    if(NOT file IN_LIST ARGN)
      string(APPEND faults "\n  tests/${folder}/${file}: not named in tests/tree/programs.cmake")
    endif()
  endforeach()
  set(faults "${faults}" PARENT_SCOPE)
endfunction()

set(names "")
list(LENGTH contracts length)
math(EXPR last "${length} - 1")
foreach(i RANGE 0 ${last} 2)
  math(EXPR next "${i} + 1")
  list(GET contracts ${i} name)
  list(GET contracts ${next} expected)
  list(APPEND names "${name}")
  set(path "${ROOT}/tests/contract/${name}")
  if(NOT EXISTS "${path}")
    string(APPEND faults "\n  tests/contract/${name}: is missing")
    continue()
  endif()
  file(SHA256 "${path}" sum)
  if(NOT sum STREQUAL expected)
    string(APPEND faults "\n  tests/contract/${name}: was changed; contract programs stay as they are")
  endif()
endforeach()
list(LENGTH names contract_count)
if(NOT contract_count EQUAL 8)
  string(APPEND faults "\n  tests/contract: ${contract_count} programs are named, and there are eight")
endif()
refuse_others(contract ${names})

foreach(name IN LISTS bits)
  if(NOT EXISTS "${ROOT}/tests/bits/${name}")
    string(APPEND faults "\n  tests/bits/${name}: is missing")
  endif()
endforeach()
refuse_others(bits ${bits})

foreach(name IN LISTS slips)
  foreach(file IN ITEMS ${name}.cpp ${name}.legal.cpp)
    if(NOT EXISTS "${ROOT}/tests/fail/${file}")
      string(APPEND faults "\n  tests/fail/${file}: is missing")
    endif()
  endforeach()
endforeach()

if(faults)
  message(FATAL_ERROR "programs:${faults}")
endif()
list(LENGTH bits bits_count)
list(LENGTH slips slip_count)
message("${contract_count} contracts to the byte, ${bits_count} program of bits, ${slip_count} slips with their twins")
