# SPDX-License-Identifier: BSL-1.0
# What a careful user compiles with; WERROR comes from the test.
add_compile_options(-Wall -Wextra -Wpedantic -Wconversion -Wshadow)
if(WERROR)
  add_compile_options(-Werror)
endif()
