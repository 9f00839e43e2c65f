// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstdint>
#include <exception>
#include <string>

#include <steelyard/base/error.hpp>
#include <steelyard/estimate/sweep.hpp>

namespace steelyard::inline v1::detail {

/// Turns the exception in flight into one that names the stage and the sample:
/// `bad_weight` keeps its kind, anything else is nested in `failed_sample`.
/// @pre called from a handler
[[noreturn]] inline void throw_located(char const* stage, std::uint64_t sample) {
  std::string const where = std::string(stage) + " of sample " + std::to_string(sample);
  try {
    throw;
  } catch (located const&) {
    throw;
  } catch (bad_weight const& e) {
    throw located{sample, std::make_exception_ptr(
                              bad_weight("weigh: sample " + std::to_string(sample) + " is refused: " + e.what() +
                                         "; allowed is a finite log-likelihood or minus infinity, or a finite "
                                         "likelihood of zero or more"))};
  } catch (std::exception const& e) {
    try {
      throw failed_sample(where + " failed: " + e.what(), sample);
    } catch (...) {
      throw located{sample, std::current_exception()};
    }
  } catch (...) {
    try {
      throw failed_sample(where + " failed with an exception that is no std::exception", sample);
    } catch (...) {
      throw located{sample, std::current_exception()};
    }
  }
}

/// Calls user code; what it throws is located.
template <class Act>
decltype(auto) call_user(char const* stage, std::uint64_t sample, Act&& act) {
  try {
    return act();
  } catch (...) {
    throw_located(stage, sample);
  }
}

/// Calls something that may throw a located exception, outside any sweep: the exception itself comes out.
template <class Act>
decltype(auto) unlocated(Act&& act) {
  try {
    return act();
  } catch (located const& failure) {
    std::rethrow_exception(failure.what);
  }
}

}  // namespace steelyard::inline v1::detail
