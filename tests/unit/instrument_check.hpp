// SPDX-License-Identifier: BSL-1.0
#pragma once

// Tools for the tests of instruments: how well fakes and scores of one
// instrument go together, and quadrature on the logarithmic scale.

#include <algorithm>
#include <array>
#include <cmath>
#include <cstddef>
#include <map>
#include <vector>

#include <boost/math/distributions/chi_squared.hpp>

#include <steelyard/instrument/instruments.hpp>

namespace instrument_check {

/// Chance of a chi-square sum as large as this one or larger.
inline double chance_of(double sum, std::size_t cells) {
  boost::math::chi_squared const law(static_cast<double>(cells - 1));
  return boost::math::cdf(boost::math::complement(law, sum));
}

/// Pearson's chi-square of counts in cells against their expected numbers,
/// cells of fewer than 10 joined to the next; returns the chance of it.
inline double chance_of_counts(std::vector<double> const& seen, std::vector<double> const& expected) {
  double sum = 0.0, o = 0.0, e = 0.0;
  std::size_t cells = 0;
  double rest = 0.0;
  for (double const each : expected) rest += each;
  for (std::size_t i = 0; i < seen.size(); ++i) {
    o += seen[i];
    e += expected[i];
    rest -= expected[i];
    if ((e >= 10.0 && rest >= 10.0) || i + 1 == seen.size()) {
      sum += (o - e) * (o - e) / e;
      ++cells;
      o = e = 0.0;
    }
  }
  return cells < 2 ? 1.0 : chance_of(sum, cells);
}

/// P(shows less) and P(shows more), 0 where `score` would refuse the limit as one that can never be.
template <class Instrument, class Truth>
double below(Instrument const& instrument, double x, Truth const& truth) {
  return std::exp(instrument.log_below(x, instrument.admit(truth)));
}
template <class Instrument, class Truth>
double above(Instrument const& instrument, double x, Truth const& truth) {
  return std::exp(instrument.log_above(x, instrument.admit(truth)));
}

/// Fakes drawn at `truth` from `drawn`, judged by the scores of `scored`: the
/// chance of a misfit as large as the one seen. Continuous: probability
/// integral transform in 50 cells; else chi-square over the numbers shown.
template <class Scored, class Drawn, class Truth>
double chance_together(Scored const& scored, Drawn const& drawn, Truth const& truth, std::uint64_t seed,
                       std::size_t repeats = 20'000) {
  namespace sy = steelyard;
  sy::draws d(seed, 0, sy::purpose::check);
  double const n = static_cast<double>(repeats);
  if constexpr (Scored::scale_kind == sy::scale_of::continuous) {
    std::vector<double> seen(50), expected(50, n / 50.0);
    for (std::size_t i = 0; i < repeats; ++i) {
      double const u = std::exp(scored.score(sy::under(drawn.draw(truth, d)), truth).value);
      ++seen[std::min<std::size_t>(static_cast<std::size_t>(u * 50.0), 49)];
    }
    return chance_of_counts(seen, expected);
  } else {
    std::map<double, double> shown;
    for (std::size_t i = 0; i < repeats; ++i) ++shown[static_cast<double>(drawn.draw(truth, d))];
    std::vector<double> seen{0.0}, expected{n * below(scored, shown.begin()->first, truth)};
    double before = shown.begin()->first;
    for (auto const& [number, times] : shown) {
      seen.push_back(times);
      expected.push_back(n * std::exp(scored.score(number, truth).value));
      before = number;
    }
    seen.push_back(0.0);
    expected.push_back(n * above(scored, before, truth));
    return chance_of_counts(seen, expected);
  }
}

/// log of the integral of e^f from a to b: Gauss-Legendre of 10 points in even panels.
template <class F>
double log_integral(F const& f, double a, double b, std::size_t panels = 200) {
  double const h = 0.5 * (b - a) / static_cast<double>(panels);
  std::vector<double> parts(panels);
  for (std::size_t i = 0; i < panels; ++i)
    parts[i] = steelyard::detail::log_integral(f, a + h * (2.0 * static_cast<double>(i) + 1.0), h);
  double const top = *std::max_element(parts.begin(), parts.end());
  double sum = 0.0;
  for (double const each : parts) sum += std::exp(each - top);
  return top + std::log(sum);
}

/// How far an instrument's density, integrated piece by piece between the
/// marks, is from what `within` says, as a share of each piece, and how far
/// everything together is from 1.
template <class Instrument, class Truth>
double worst_mass(Instrument const& instrument, Truth const& truth, std::vector<double> const& marks) {
  namespace sy = steelyard;
  double worst = 0.0;
  double total = below(instrument, marks.front(), truth) + above(instrument, marks.back(), truth);
  auto const density = [&](double x) { return instrument.score(x, truth).value; };
  for (std::size_t i = 0; i + 1 < marks.size(); ++i) {
    double const by_density = log_integral(density, marks[i], marks[i + 1]);
    double const by_limits = instrument.score(sy::within(marks[i], marks[i + 1]), truth).value;
    worst = std::max(worst, std::abs(by_density - by_limits));
    total += std::exp(by_density);
    worst = std::max(worst, std::abs(below(instrument, marks[i], truth) + above(instrument, marks[i], truth) - 1.0));
  }
  return std::max(worst, std::abs(total - 1.0));
}

/// The same for whole numbers (step 1) or steps from `first` on: every
/// probability against `under`, `over` and `within`, and their sum against 1.
template <class Instrument, class Truth>
double worst_sum(Instrument const& instrument, Truth const& truth, double step, long first, long last) {
  namespace sy = steelyard;
  double const start = step * static_cast<double>(first), before = below(instrument, start, truth);
  double worst = 0.0, sum = before;
  for (long k = first; k <= last; ++k) {
    double const x = step * static_cast<double>(k);
    worst = std::max(worst, std::abs(sum - below(instrument, x, truth)));
    sum += std::exp(instrument.score(x, truth).value);
    worst = std::max(worst, std::abs(sum + above(instrument, x, truth) - 1.0));
    if (k > first)
      worst = std::max(worst, std::abs(before + std::exp(instrument.score(sy::within(start, x), truth).value) - sum));
  }
  return worst;
}

}  // namespace instrument_check
