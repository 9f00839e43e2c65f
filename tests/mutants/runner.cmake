# SPDX-License-Identifier: BSL-1.0
# Mutants that the runner must turn down.
mutant(survives base/sums.hpp unit/base_sums.cpp
  "nothing"
  [==[Number of terms added.]==]
  [==[The number of terms added.]==])
mutant(breaks_the_build base/sums.hpp unit/base_sums.cpp
  "the language"
  [==[return terms_; }]==]
  [==[return no_such_name; }]==])
mutant(stands_nowhere base/sums.hpp unit/base_sums.cpp
  "nothing"
  [==[words that are not in the header]==]
  [==[]==])
mutant(stands_twice base/sums.hpp unit/base_sums.cpp
  "too much"
  [==[std::size_t level = 0;]==]
  [==[std::size_t level = 1;]==])
