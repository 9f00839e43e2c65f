// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <iosfwd>
#include <string>
#include <vector>

#include <steelyard/ask/weighted_mean.hpp>
#include <steelyard/base/text.hpp>
#include <steelyard/sample/weighted_sample.hpp>

namespace steelyard::inline v1 {

/// What one reading did to an answer.
struct reading_influence {
  std::string name;
  estimate moved;                      ///< the answer with all readings less that without this one
  double effective_size_without = 0.0;
  double effective_size_with = 0.0;    ///< its fall is what the reading cost
};

/// Which reading decided: for each, how far it alone moved the expectation of a
/// readout, with the error of that difference, and how much effective size it cost. No new run.
/// @throws bad_argument where the sample has no named readings.
template <class X, class Readout>
std::vector<reading_influence> decided(weighted_sample<X> const& sample, Readout const& readout) {
  constexpr bool fine = readout_columns<detail::result_t<Readout, X const&>>::size == 1;
  static_assert(fine, "steelyard: decided() takes a readout of these states that returns one number");
  if (sample.names().empty()) throw bad_argument("decided: this sample has no readings left to take away");
  std::vector<reading_influence> all;
  for (std::string const& name : sample.names()) {
    weighted_sample<X> const without = sample.without(name);
    if constexpr (fine) {
      std::vector<double> const values = without.values(readout);
      all.push_back({name, detail::weighting_difference(sample, without, values), without.diagnosis().effective_size(),
                     sample.diagnosis().effective_size()});
    }
  }
  return all;
}

/// One sentence a reading.
[[nodiscard]] inline std::string to_string(reading_influence const& r) {
  return "Reading '" + r.name + "' moved the answer by " +
         detail::rounded_to_error(r.moved.value, r.moved.standard_error) + " (" + std::string(to_string(r.moved.verdict())) +
         ") and brought the effective size from " + detail::short_number(r.effective_size_without) + " to " +
         detail::short_number(r.effective_size_with) + ".";
}

template <class Char, class Traits>
std::basic_ostream<Char, Traits>& operator<<(std::basic_ostream<Char, Traits>& out, reading_influence const& r) {
  return out << to_string(r).c_str();
}

}  // namespace steelyard::inline v1
