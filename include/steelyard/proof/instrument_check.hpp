// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cmath>
#include <cstddef>
#include <cstdint>
#include <functional>
#include <span>
#include <string>
#include <utility>
#include <vector>

#include <steelyard/base/count.hpp>
#include <steelyard/base/elementary.hpp>
#include <steelyard/base/text.hpp>
#include <steelyard/draw/draws.hpp>
#include <steelyard/proof/agrees.hpp>
#include <steelyard/proof/check.hpp>
#include <steelyard/weigh/itemised.hpp>

namespace steelyard::inline v1::proof {

struct instrument_options {
  count fakes = 20'000;      ///< readings faked for each truth
  count seed = 1;
  double false_alarm = 1e-4;
};

/// Whether an instrument's scores belong to the readings it fakes: for truths t
/// and t' near each other, fakes y of t satisfy
///   E exp(score(y, t') - score(y, t)) = 1
/// because the density of y given t' has mass one over what t can show; a wrong width, a missing factor that
/// depends on the truth, or fakes from another law make the mean differ. Neighbouring truths are compared both ways.
///   instrument.score(reading, truth) -> log_likelihood,  instrument.draw(truth, draws&) -> reading
/// @param truths  at least two, in order, near enough for the instrument to confuse neighbours (a gap of about
///                its own error); a support that moves with the truth hides mass and cannot be checked so
template <class Instrument, class Truth>
check instrument_check(Instrument const& instrument, std::span<Truth const> truths, instrument_options const& options = {}) {
  detail::checked_rate("instrument_check", options.false_alarm);
  if (truths.size() < 2) throw bad_argument("instrument_check: at least two truths are needed");
  std::size_t const pairs = 2 * (truths.size() - 1);
  double const n = static_cast<double>(options.fakes.value());
  double worst = 0.0;
  std::string text;
  bool fine = true, seen = true;
  for (std::size_t p = 0; p < pairs; ++p) {
    Truth const& from = truths[p / 2 + p % 2];
    Truth const& to = truths[p / 2 + 1 - p % 2];
    double mean = 0.0, square = 0.0, fourth = 0.0;
    std::vector<double> ratios;
    ratios.reserve(static_cast<std::size_t>(options.fakes.value()));
    for (std::uint64_t i = 0; i < options.fakes; ++i) {
      draws source(options.seed, i, purpose::calibration, 4 + p);
      auto const reading = instrument.draw(from, source);
      double const own = detail::up::to_log(instrument.score(reading, from));
      if (!(own > detail::up::impossible))
        return {outcome::failed, "fake " + std::to_string(i) + " of truth " + std::to_string(p / 2 + p % 2) +
                                     " is impossible by the instrument's own score"};
      double const other = detail::up::to_log(instrument.score(reading, to));
      ratios.push_back(other > detail::up::impossible ? detail::up::portable_exp(other - own) : 0.0);
      mean += ratios.back() / n;
    }
    for (double const r : ratios) {
      double const d = (r - mean) * (r - mean);
      square += d;
      fourth += d * d;
    }
    double const se = std::sqrt(square / (n * (n - 1.0)));
    double const carriers = fourth > 0.0 ? square * (square / fourth) : 0.0;
    check const one = detail::gap_check(mean - 1.0, se, carriers - 1.0, "mean ratio and one",
                                        {.false_alarm = options.false_alarm / static_cast<double>(pairs)});
    double const off = se > 0.0 ? std::abs(mean - 1.0) / se : 0.0;
    if (one.result() == outcome::failed) fine = false;
    if (one.result() == outcome::cannot_certify) seen = false;
    if (off >= worst) {
      worst = off;
      text = "between truths " + std::to_string(p / 2) + " and " + std::to_string(p / 2 + 1) + ": " + one.sentence();
    }
  }
  return {!fine ? outcome::failed : seen ? outcome::passed : outcome::cannot_certify, "worst " + text};
}

}  // namespace steelyard::inline v1::proof
