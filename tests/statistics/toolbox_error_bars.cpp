// SPDX-License-Identifier: BSL-1.0
#include <doctest/doctest.h>

#include <array>
#include <cmath>
#include <cstddef>
#include <cstdint>
#include <cstdio>
#include <string>
#include <vector>

#include <steelyard/core.hpp>

#include "statistics/cells.hpp"

// Error bars of the toolbox from both sides: over 4000 seeds the mean of z^2, z = (answer - exact) / standard error, is
// 1 within 0.1, or what Student's t makes of it; and intervals cover what they claim where the runs say `sound`.

namespace {

using namespace known;

struct state {
  double x, e;
};
double x_of(state const& s) { return s.x; }
double e_of(state const& s) { return s.e; }
double y_of(state const& s) { return 0.6 * s.x + 0.8 * s.e; }

/// Answers to the toolbox questions on one sample, with the truth beside each.
template <class Sample>
std::vector<asked> ask(Sample const& sample, double mean, double sd, double skewness, double kurtosis, double r,
                       double below, double cell_probability, double shortest) {
  auto const [m, c, f, h, k] = sample.estimate(
      sy::moments(x_of), sy::covariance([](state const& s) {
        return std::array{s.x, y_of(s)};
      }),
      sy::cumulative(x_of, {mean}), sy::histogram_2d(x_of, e_of, sy::bins({mean, mean + sd}), sy::bins({0.0, 9.0})),
      sy::shortest_interval(x_of, 0.8));
  return {{m.mean, mean},           {m.sd, sd},           {m.skewness, skewness},
          {m.kurtosis, kurtosis},   {c(0, 0), sd * sd},   {c(1, 0), 0.6 * sd * sd},
          {c.correlation(0, 1), r}, {f.shares[0], below}, {h.probability(0, 0), cell_probability},
          {k.width, shortest}};
}
char const* const names[] = {"mean",       "sd",          "skewness", "kurtosis", "variance",
                             "covariance", "correlation", "F",        "cell",     "shortest width"};

double phi(double x) { return 0.5 * std::erfc(-x / std::sqrt(2.0)); }

/// Prior N(0, 1) read as 1 with sd 1: the posterior of x is N(0.5, 0.5).
std::vector<asked> ask_normal(std::uint64_t seed, std::uint64_t size) {
  static sy::pipeline const pipe{[](sy::draws& draws) {
                                   double const x = draws.normal();
                                   return state{x, draws.normal()};
                                 },
                                 [](state const& s) { return sy::log_likelihood{-0.5 * (1.0 - s.x) * (1.0 - s.x)}; }};
  double const sd = std::sqrt(0.5);
  return ask(pipe.run({.size = size, .seed = seed}), 0.5, sd, 0.0, 3.0, 0.6 * sd / std::sqrt(0.36 * 0.5 + 0.64), 0.5,
             (phi(1.0) - 0.5) * 0.5, 2.0 * 1.2815515655446004 * sd);
}
/// Prior Exp(1), likelihood x^2 e^-x: the posterior of x is gamma of shape 3 and rate 2.
std::vector<asked> ask_gamma(std::uint64_t seed, std::uint64_t size) {
  static sy::pipeline const pipe{[](sy::draws& draws) {
                                   double const x = draws.exponential(1.0);
                                   return state{x, draws.normal()};
                                 },
                                 [](state const& s) { return sy::log_likelihood{2.0 * std::log(s.x) - s.x}; }};
  double const mean = 1.5, sd = std::sqrt(0.75);
  auto const below = [](double x) { return 1.0 - std::exp(-2.0 * x) * (1.0 + 2.0 * x + 2.0 * x * x); };
  // The shortest 80 %: equal densities at both ends.
  double low = 0.0, high = mean;
  auto const other_end = [&](double a) {
    double near = a, far = 50.0;
    for (int i = 0; i < 200; ++i) (below(0.5 * (near + far)) - below(a) < 0.8 ? near : far) = 0.5 * (near + far);
    return near;
  };
  auto const density = [](double x) { return x * x * std::exp(-2.0 * x); };
  for (int i = 0; i < 100; ++i) {
    double const a = 0.5 * (low + high);
    (below(a) < 0.2 && density(a) < density(other_end(a)) ? low : high) = a;
  }
  return ask(pipe.run({.size = size, .seed = seed}), mean, sd, 2.0 / std::sqrt(3.0), 5.0,
             0.6 * sd / std::sqrt(0.36 * 0.75 + 0.64), below(mean), (below(mean + sd) - below(mean)) * 0.5,
             other_end(low) - low);
}

/// The same questions of ensembles drawn from that posterior.
std::vector<asked> ask_ensemble(std::uint64_t seed, sy::scheme how) {
  static sy::pipeline const pipe{[](sy::draws& draws) {
                                   double const x = draws.normal();
                                   return state{x, draws.normal()};
                                 },
                                 [](state const& s) { return sy::log_likelihood{-0.5 * (1.0 - s.x) * (1.0 - s.x)}; }};
  auto const ensemble = pipe.run({.size = 1500, .seed = seed}).resample(1000, {.seed = seed, .scheme = how});
  auto const [mean, m, r, p, q] =
      ensemble.estimate(sy::expectation(x_of), sy::moments(x_of), sy::correlation(x_of, y_of),
                        sy::probability([](state const& s) { return s.x > 1.0; }), sy::quantile(x_of, 0.5));
  double const sd = std::sqrt(0.5);
  return {{mean, 0.5},         {m.sd, sd}, {r, 0.6 * sd / std::sqrt(0.36 * 0.5 + 0.64)},
          {p, phi(-0.5 / sd)}, {q, 0.5},   {ensemble.expectation(x_of), 0.5}};
}
char const* const ensemble_names[] = {"mean", "sd", "correlation", "probability", "median", "mean, scheme known"};

double by_student(double degrees) { return degrees / (degrees - 2.0); }

/// Both promises of a cell that says `sound`, with a line for each cell.
void check_cell(std::string const& problem, std::size_t size, std::string const& name, cell const& c, double z2,
                double within) {
  std::string note = c.promises() ? "sound" : "";
  for (std::size_t l = 0; l < levels.size(); ++l)
    if (int const v = c.verdict_on(l); v != 0) note += v < 0 ? " low" : " high";
  print(problem, size, name, c, note);
  INFO(problem << ", " << size << ", " << name);
  if (!c.promises()) return;
  CHECK(std::abs(c.mean_z2() - z2) <= within);
  for (std::size_t l = 0; l < levels.size(); ++l) CHECK(c.verdict_on(l) == 0);
}

}  // namespace

TEST_CASE("toolbox: standard errors are right from both sides, and intervals cover what they claim") {
  print_heading();
  for (std::size_t const size : {std::size_t{1000}, std::size_t{4000}, std::size_t{16'000}}) {
    if (size > 1000 && !honest()) continue;
    for (bool const normal : {true, false}) {
      auto const cells =
          ask_often(4000, [&](std::uint64_t seed) { return normal ? ask_normal(seed, size) : ask_gamma(seed, size); });
      for (std::size_t q = 0; q < cells.size(); ++q) {
        bool const width =
            std::string(names[q]) == "shortest width";  // from 16 parts, and its error counts a small bias in
        check_cell(normal ? "normal" : "gamma", size, names[q], cells[q], width ? by_student(15.0) : 1.0, 0.1);
      }
      CHECK(cells[0].promises());
      CHECK(cells[1].promises());
      CHECK(cells[6].promises());
      CHECK(cells[9].promises());
    }
  }
}

TEST_CASE("toolbox: an ensemble's error bars hold the parent's error and the draw's, by every scheme") {
  print_heading();
  struct draw {
    char const* name;
    sy::scheme how;
  };
  for (draw const& d : {draw{"systematic", sy::scheme::systematic}, draw{"multinomial", sy::scheme::multinomial},
                        draw{"stratified", sy::scheme::stratified}, draw{"residual", sy::scheme::residual},
                        draw{"priority", sy::scheme::priority}, draw{"successive", sy::scheme::successive}}) {
    auto const cells = ask_often(honest() ? 4000 : 2000, [&](std::uint64_t seed) { return ask_ensemble(seed, d.how); });
    for (std::size_t q = 0; q < cells.size(); ++q) {
      bool const median =
          std::string(ensemble_names[q]) == "median";  // its standard error is half a width of its limits
      check_cell(d.name, 1000, ensemble_names[q], cells[q], 1.0, median || !honest() ? 0.16 : 0.1);
      if (q != 1 && q != 2) CHECK(cells[q].promises());
    }
  }
}

TEST_CASE("toolbox: the bins that may be the highest hold the one that is") {
  // Posterior N(0.5, 0.5); of these bins 0.4 to 0.9 has the highest density, its neighbour -0.1 to 0.4 a little less.
  static sy::pipeline const pipe{[](sy::draws& draws) { return draws.normal(); },
                                 [](double x) { return sy::log_likelihood{-0.5 * (1.0 - x) * (1.0 - x)}; }};
  std::uint64_t const repeats = 2000;
  for (std::uint64_t const size : {300u, 3000u, 30'000u}) {
    if (size > 3000 && !honest()) continue;
    std::uint64_t held = 0, alone = 0, right = 0;
    for (std::uint64_t seed = 1; seed <= repeats; ++seed) {
      auto const m = pipe.mode(
          {.size = size, .seed = seed}, [](double x) { return x; }, sy::equal_bins(-2.1, 2.9, 10));
      sy::interval const limits = m.error_interval(0.95);
      held += limits.lower < 0.45 && limits.upper > 0.85 ? 1u : 0u;
      alone += m.rivals(0.95).empty() ? 1u : 0u;
      right += m.bin() == 5 ? 1u : 0u;
    }
    std::printf("mode of %llu: held %.4f, alone %.4f, right %.4f\n", static_cast<unsigned long long>(size),
                static_cast<double>(held) / static_cast<double>(repeats),
                static_cast<double>(alone) / static_cast<double>(repeats),
                static_cast<double>(right) / static_cast<double>(repeats));
    CHECK(held >= hit_limits(repeats, 0.95, 1.0).least);
    if (size == 30'000) CHECK(alone > repeats * 9 / 10);
    if (size == 300) CHECK(right < repeats);
  }
}
