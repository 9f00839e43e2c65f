// SPDX-License-Identifier: BSL-1.0
// legs: plain
#include <doctest/doctest.h>

#include <steelyard/draw/draws.hpp>
#include <steelyard/proof/instrument_check.hpp>
#include <steelyard/proof/unbiased_resampling.hpp>
#include <steelyard/sample/scheme.hpp>

#include <algorithm>
#include <cmath>
#include <cstddef>
#include <cstdint>
#include <span>
#include <string>
#include <vector>

namespace sy = steelyard;
using sy::proof::instrument_check;
using sy::proof::outcome;
using sy::proof::unbiased_resampling;

namespace {

bool says(sy::proof::check const& c, char const* words) { return c.sentence().find(words) != std::string::npos; }

std::vector<double> const weights{0.1, 0.2, 0.3, 0.4, 0.0, 1.7};

auto by(sy::scheme how) {
  return [how](std::span<double const> w, std::size_t k, sy::draws& d) {
    return sy::detail::draw_slots(how, w, k, d).positions;
  };
}

/// Systematic resampling written plainly: step k stands at (u + k + offset) / copies of the whole.
auto systematic(double offset, double fixed = -1.0) {
  return [=](std::span<double const> w, std::size_t copies, sy::draws& d) {
    double const u = fixed < 0.0 ? d.uniform() : fixed;
    double total = 0.0, sum = 0.0;
    for (double const each : w) total += each;
    std::vector<std::size_t> positions;
    std::size_t i = 0;
    sum = w[0];
    for (std::size_t k = 0; k < copies; ++k) {
      double const at = total * std::min((u + static_cast<double>(k) + offset) / static_cast<double>(copies), 1.0);
      while (sum < at && i + 1 < w.size()) sum += w[++i];
      positions.push_back(i);
    }
    return positions;
  };
}

/// A normal instrument whose score and fakes may differ.
struct normal_scale {
  double score_sd = 0.5, fake_sd = 0.5;
  double growth = 0.0;      ///< both widths are (1 + growth x truth) times that
  bool normalised = true;   ///< whether the score keeps its factor 1/width
  double offset = 0.0;      ///< of the fakes

  [[nodiscard]] double width(double truth) const { return 1.0 + growth * truth; }
  [[nodiscard]] sy::log_likelihood score(double reading, double truth) const {
    double const s = score_sd * width(truth);
    return sy::log_likelihood{-0.5 * std::pow((reading - truth) / s, 2) - (normalised ? std::log(s) : 0.0)};
  }
  [[nodiscard]] double draw(double truth, sy::draws& d) const {
    return truth + offset + fake_sd * width(truth) * d.normal();
  }
};
std::vector<double> const truths{1.0, 1.4, 1.8};

}  // namespace

TEST_CASE("schemes with replacement draw items in proportion to their weights") {
  for (sy::scheme const how :
       {sy::scheme::systematic, sy::scheme::multinomial, sy::scheme::stratified, sy::scheme::residual})
    for (unsigned const copies : {1u, 4u, 25u}) {
      INFO("scheme ", static_cast<int>(how), ", ", copies, " copies");
      auto const c = unbiased_resampling(by(how), weights, {.copies = copies});
      INFO(c.sentence());
      CHECK(c);
    }
  CHECK(unbiased_resampling(systematic(0.0), weights));
}

TEST_CASE("biased resamplers are caught") {
  CHECK(unbiased_resampling(systematic(1.0), weights).result() == outcome::failed);          // off by one
  CHECK(unbiased_resampling(systematic(0.0, 0.5), weights).result() == outcome::failed);     // no random number at all
  CHECK(unbiased_resampling(systematic(0.1), weights).result() == outcome::failed);          // a tenth of a step
  auto const squared = [](std::span<double const> w, std::size_t k, sy::draws& d) {
    std::vector<double> other(w.begin(), w.end());
    for (double& each : other) each *= each;
    return sy::detail::draw_slots(sy::scheme::multinomial, other, k, d).positions;
  };
  CHECK(unbiased_resampling(squared, weights).result() == outcome::failed);
  // drawing each item once at most, in proportion to what is left, is not in proportion to weight
  CHECK(unbiased_resampling(by(sy::scheme::successive), weights, {.copies = 3}).result() == outcome::failed);
  auto const even = [](std::span<double const> w, std::size_t k, sy::draws& d) {
    std::vector<std::uint64_t> positions;
    for (std::size_t i = 0; i < k; ++i) positions.push_back(d.index(w.size() - 2));
    return positions;
  };
  CHECK(unbiased_resampling(even, weights).result() == outcome::failed);
}

TEST_CASE("resamplers that return what they must not") {
  auto const fixed = [](std::vector<std::size_t> positions) {
    return [=](std::span<double const>, std::size_t, sy::draws&) { return positions; };
  };
  CHECK(says(unbiased_resampling(fixed({0, 1, 6}), weights, {.copies = 3}), "drew item 6, of which there are 6"));
  CHECK(says(unbiased_resampling(fixed({0, 1}), weights, {.copies = 3}), "drew 2 items where 3 were asked for"));
  CHECK(says(unbiased_resampling(fixed({0, 1, 4}), weights, {.copies = 3}), "drew item 4, whose weight is zero"));
}

TEST_CASE("rare items: no false alarm, and no certificate") {
  std::vector<double> const rare{1.0, 1e-5};
  for (unsigned const seed : {1u, 2u, 3u, 4u, 5u}) {
    auto const c = unbiased_resampling(by(sy::scheme::multinomial), rare, {.copies = 2, .seed = seed});
    CHECK(c.result() == outcome::cannot_certify);
    CHECK(says(c, "too seldom"));
  }
}

TEST_CASE("a right resampler fails at the stated rate") {
  std::uint64_t alarms = 0;
  constexpr std::uint64_t trials = 400;
  for (std::uint64_t seed = 1; seed <= trials; ++seed)
    alarms += unbiased_resampling(by(sy::scheme::multinomial), weights,
                                  {.copies = 5, .repeats = 1'000, .seed = seed, .false_alarm = 0.1})
                      .result() == outcome::failed
                  ? 1u
                  : 0u;
  auto const limits = sy::proof::detail::hit_limits(trials, 0.1, 1e-5);
  CHECK(alarms <= limits.second);
  CHECK(alarms >= limits.first / 2);  // the items share the rate, and are not independent
}

TEST_CASE("instruments: scores that belong to the fakes pass") {
  CHECK(instrument_check(normal_scale{}, truths));
  CHECK(instrument_check(normal_scale{.growth = 0.3}, truths));
  CHECK(instrument_check(normal_scale{}, {1.0, 1.5}));
}

TEST_CASE("instruments: a wrong width, a lost factor, an offset are caught") {
  CHECK(instrument_check(normal_scale{.score_sd = 0.45}, truths).result() == outcome::failed);
  CHECK(instrument_check(normal_scale{.score_sd = 0.55}, truths).result() == outcome::failed);
  CHECK(instrument_check(normal_scale{.growth = 0.3, .normalised = false}, truths).result() == outcome::failed);
  CHECK(instrument_check(normal_scale{.offset = 0.1}, truths).result() == outcome::failed);
  CHECK(says(instrument_check(normal_scale{.offset = 0.1}, truths), "fakes of truth 0 scored at truth 1"));
}

TEST_CASE("instruments: truths too far apart cannot be certified, impossible fakes are a failure") {
  CHECK(instrument_check(normal_scale{}, {1.0, 9.0}).result() == outcome::cannot_certify);
  struct {
    [[nodiscard]] sy::log_likelihood score(double reading, double truth) const {
      return sy::log_likelihood{std::abs(reading - truth) < 0.5 ? 0.0 : sy::detail::impossible};
    }
    [[nodiscard]] double draw(double truth, sy::draws& d) const { return truth + d.normal(); }
  } const strict;
  CHECK(says(instrument_check(strict, truths), "impossible by the instrument's own score"));
}

TEST_CASE("an honest instrument fails at the stated rate") {
  std::uint64_t alarms = 0;
  constexpr std::uint64_t trials = 300;
  for (std::uint64_t seed = 1; seed <= trials; ++seed)
    alarms +=
        instrument_check(normal_scale{}, {1.0, 1.25}, {.fakes = 1'000, .seed = seed, .false_alarm = 0.1}).result() ==
                outcome::failed
            ? 1u
            : 0u;
  auto const limits = sy::proof::detail::hit_limits(trials, 0.1, 1e-5);
  CHECK(alarms <= limits.second);
  CHECK(alarms >= limits.first / 2);
}

TEST_CASE("bad input to unbiased_resampling and instrument_check") {
  CHECK_THROWS_AS(unbiased_resampling(systematic(0.0), std::vector<double>{0.0, 0.0}), sy::bad_argument);
  CHECK_THROWS_AS(unbiased_resampling(systematic(0.0), std::vector<double>{1.0, -1.0}), sy::bad_argument);
  CHECK_THROWS_AS(unbiased_resampling(systematic(0.0), weights, {.copies = 0}), sy::bad_argument);
  CHECK_THROWS_AS(unbiased_resampling(systematic(0.0), weights, {.repeats = 99}), sy::bad_argument);
  CHECK_THROWS_AS(unbiased_resampling(systematic(0.0), weights, {.false_alarm = 2.0}), sy::bad_argument);
  CHECK_THROWS_AS(instrument_check(normal_scale{}, {1.0}), sy::bad_argument);
  CHECK_THROWS_AS(instrument_check(normal_scale{}, truths, {.fakes = 10}), sy::bad_argument);
}
