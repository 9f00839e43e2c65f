// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cmath>
#include <cstddef>
#include <cstdint>
#include <initializer_list>
#include <span>
#include <string>
#include <type_traits>
#include <vector>

#include <steelyard/base/count.hpp>
#include <steelyard/base/elementary.hpp>
#include <steelyard/base/error.hpp>
#include <steelyard/base/text.hpp>
#include <steelyard/draw/draws.hpp>
#include <steelyard/proof/agrees.hpp>
#include <steelyard/proof/check.hpp>
#include <steelyard/proof/progress.hpp>
#include <steelyard/weigh/itemised.hpp>

namespace steelyard::inline v1::proof {

struct instrument_options {
  count fakes = 20'000;      ///< readings faked for each pair of neighbouring truths, each way
  count seed = 1;
  double false_alarm = 1e-4;
  proof::progress progress = {};
};

namespace detail {

/// Mean of exp(score(y, to) - score(y, from)) over fakes y of `from`, against 1.
template <class Instrument, class Truth>
check compare_truths(Instrument const& instrument, Truth const& from, Truth const& to, std::uint64_t round,
                     instrument_options const& options, double rate) {
  double const n = static_cast<double>(options.fakes.value());
  double mean = 0.0, square = 0.0, fourth = 0.0;
  std::vector<double> ratios;
  ratios.reserve(static_cast<std::size_t>(options.fakes.value()));
  for (std::uint64_t i = 0; i < options.fakes; ++i) {
    draws source(options.seed, i, purpose::calibration, round);
    auto const reading = instrument.draw(from, source);
    double const own = up::to_log(instrument.score(reading, from));
    if (!(own > up::impossible))
      return {outcome::failed, "fake " + std::to_string(i) + " is impossible by the instrument's own score"};
    double const other = up::to_log(instrument.score(reading, to));
    ratios.push_back(other > up::impossible ? up::portable_exp(other - own) : 0.0);
    mean += ratios.back() / n;
  }
  for (double const r : ratios) {
    double const d = (r - mean) * (r - mean);
    square += d;
    fourth += d * d;
  }
  double const carriers = fourth > 0.0 ? square * (square / fourth) : 0.0;
  return gap_check({mean - 1.0, std::sqrt(square / (n * (n - 1.0))), carriers - 1.0, 1e-9}, "the mean ratio and 1",
                   {.false_alarm = rate});
}

}  // namespace detail

/// Whether an instrument's scores belong to the readings it fakes: for truths t
/// and t' near each other, fakes y of t satisfy
///   E exp(score(y, t') - score(y, t)) = 1
/// because the density of y given t' has mass one over what t can show; a wrong width, a missing factor that
/// depends on the truth, or fakes from another law make the mean differ. Neighbouring truths are compared both ways.
///   instrument.score(reading, truth) -> log_likelihood,  instrument.draw(truth, draws&) -> reading
/// Assumes  a support that does not move with the truth: mass that only t' can show is missed. A factor common to all
/// truths cancels, and is not seen.
/// @param truths  at least two, in order, about one error of the instrument apart: further ones leave too few fakes in
///                common, and the check cannot certify
/// @throws bad_argument for fewer than two truths or under 100 fakes.
/// Cost  2 (truths - 1) x fakes readings.
template <class Instrument, class Truth>
check instrument_check(Instrument const& instrument, std::span<Truth const> truths,
                       instrument_options const& options = {}) {
  detail::checked_rate("instrument_check", options.false_alarm);
  if (truths.size() < 2) throw bad_argument("instrument_check: at least two truths are needed");
  if (options.fakes < 100u)
    throw bad_argument("instrument_check: " + std::to_string(options.fakes.value()) +
                       " fakes were asked for; at least 100 are needed");
  std::size_t const pairs = 2 * (truths.size() - 1);
  detail::repeat_counter done(options.progress, pairs * options.fakes);
  outcome worst = outcome::passed;
  std::string text;
  for (std::size_t p = 0; p < pairs; ++p) {
    std::size_t const from = p / 2 + p % 2, to = p / 2 + 1 - p % 2;
    check const one = detail::compare_truths(instrument, truths[from], truths[to], 4 + p, options,
                                             options.false_alarm / static_cast<double>(pairs));
    done.add(options.fakes);
    bool const worse = one.result() == outcome::failed
                           ? worst != outcome::failed
                           : one.result() == outcome::cannot_certify && worst == outcome::passed;
    if (!worse) continue;
    worst = one.result();
    text = "fakes of truth " + std::to_string(from) + " scored at truth " + std::to_string(to) + ": " + one.sentence();
  }
  if (worst != outcome::passed) return {worst, text};
  return {worst, "scores and fakes belong together at " + std::to_string(truths.size()) + " truths, by " +
                     std::to_string(options.fakes.value()) + " fakes each way"};
}
template <class Instrument>
check instrument_check(Instrument const& instrument, std::initializer_list<double> truths,
                       instrument_options const& options = {}) {
  return instrument_check(instrument, std::span<double const>(truths.begin(), truths.size()), options);
}
template <class Instrument, class Truth>
check instrument_check(Instrument const& instrument, std::vector<Truth> const& truths,
                       instrument_options const& options = {}) {
  return instrument_check(instrument, std::span<Truth const>(truths), options);
}

}  // namespace steelyard::inline v1::proof
