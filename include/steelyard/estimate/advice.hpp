// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cmath>
#include <cstdint>
#include <iosfwd>
#include <string>
#include <utility>

#include <steelyard/base/bits.hpp>
#include <steelyard/base/error.hpp>
#include <steelyard/base/text.hpp>
#include <steelyard/estimate/diagnosis.hpp>
#include <steelyard/estimate/estimate.hpp>

namespace steelyard::inline v1 {

/// How many more samples an answer asks for, where that can be said.
struct sample_advice {
  bool known = false;
  std::uint64_t more = 0;  ///< 0: none
  std::string text;        ///< one sentence: how many, or why it cannot be said
};

namespace detail {

/// Advice for samples in proportion to `factor`; none where the error bar does not follow n^(-1/2), or cannot be
/// trusted to.
inline sample_advice advice_for(estimate const& e, diagnosis const& health, double factor, std::string const& goal) {
  auto const none = [](std::string why) {
    return sample_advice{false, 0, "How many more samples it takes cannot be said: " + std::move(why)};
  };
  if (e.groups() > 0.0) return none("the error bar comes from few groups.");
  if (e.verdict() == verdict::broken)
    return none("the error bar itself is broken; draw several times as many and look again.");
  if (!health.settles())
    return none(health.tail_known()
                    ? "the largest weights have tail index " +
                          rounded_to_error(health.tail_index(), health.tail_index_error()) +
                          ", and their variance is infinite from 0.5 on; no bound on the likelihood is declared."
                    : "too few weights differ to tell their tail, and no bound on the likelihood is declared.");
  double const more = std::ceil(static_cast<double>(health.drawn()) * (factor - 1.0));
  if (!(more > 0.0)) return {true, 0, "No more samples are needed for " + goal + "."};
  if (!(more < 9e18)) return none("it is beyond what can be counted.");
  double unit = 1.0;
  while (more / unit >= 100.0) unit *= 10.0;
  auto const about = static_cast<std::uint64_t>(std::floor(more / unit + 0.5) * unit);
  return {true, static_cast<std::uint64_t>(more),
          "About " + std::to_string(about) + " more samples are needed for " + goal + "."};
}

}  // namespace detail

/// How many more samples would bring the standard error down to a target, as its square falls with 1/n.
/// Said only where the weights let error bars settle, see `diagnosis::settles`.
/// @throws bad_argument unless the target is a positive finite number.
inline sample_advice more_samples(estimate const& e, diagnosis const& health, double target) {
  if (!detail::is_finite(target) || !(target > 0.0))
    throw bad_argument("more_samples: the target " + detail::plain_number(target) +
                       " must be a positive finite number");
  double const times = e.standard_error / target;
  return detail::advice_for(e, health, times * times, "a standard error of " + detail::short_number(target));
}
/// How many more samples would make the error bar sound: 30 carriers and an effective size of 50, which grow with n.
inline sample_advice more_samples(estimate const& e, diagnosis const& health) {
  double const carriers = e.carriers > 0.0 ? 30.0 / e.carriers : 0.0;
  double const size = e.effective_size > 0.0 ? 50.0 / e.effective_size : 0.0;
  return detail::advice_for(e, health, carriers > size ? carriers : size, "a sound error bar");
}

template <class Char, class Traits>
std::basic_ostream<Char, Traits>& operator<<(std::basic_ostream<Char, Traits>& out, sample_advice const& a) {
  return out << a.text.c_str();
}

}  // namespace steelyard::inline v1
