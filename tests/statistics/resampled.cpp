// SPDX-License-Identifier: BSL-1.0
// legs: honest
#include <doctest/doctest.h>

#include <array>
#include <cmath>
#include <cstddef>
#include <cstdint>
#include <cstdio>
#include <string>
#include <vector>

#include "statistics/questions.hpp"

// Error bars of resampled ensembles: they hold the parent's error and that of the draw, with every scheme, kept and in one pass.

namespace {

using namespace known;

struct draw {
  char const* name;
  sy::scheme how;
  bool with_replacement;
};
constexpr std::array draws_tried{
    draw{"systematic", sy::scheme::systematic, true},   draw{"stratified", sy::scheme::stratified, true},
    draw{"residual", sy::scheme::residual, true},       draw{"multinomial", sy::scheme::multinomial, true},
    draw{"priority", sy::scheme::priority, false},      draw{"successive", sy::scheme::successive, false}};
constexpr std::array asked_of_each{"mean", "probability", "median", "bin"};

/// What every ensemble of k states is asked, after each scheme and in one pass; the names go with the answers.
std::vector<asked> ask_ensembles(problem const& p, std::uint64_t seed, std::size_t size, std::size_t k,
                                 std::vector<std::string>* names) {
  auto const x = &point::x;
  double const edge = p.exact.quantile(1.0 - p.tail);
  std::pair<double, double> const bin = middle_bin(p.exact);
  double const low = bin.first, high = bin.second;
  auto const event = [edge](point const& s) { return s.x > edge; };
  std::vector<asked> all;
  auto const ask = [&](char const* name, sy::ensemble<point> const& drawn) {
    all.emplace_back(drawn.expectation(x), p.exact.mean);
    all.emplace_back(drawn.probability(event), 1.0 - p.exact.below(edge));
    auto const others = drawn.estimate(sy::quantile(x, 0.5), sy::histogram(x, sy::bins({low, high})));
    all.emplace_back(others.template get<0>(), p.exact.quantile(0.5));
    all.emplace_back(others.template get<1>().probability(0), p.exact.below(high) - p.exact.below(low));
    if (names != nullptr)
      for (char const* const question : asked_of_each) names->push_back(std::string(name) + ", " + question);
  };
  auto const sample = p.from.sample(seed, size);
  for (draw const& each : draws_tried)
    if (each.with_replacement || k < size) ask(each.name, sample.resample(k, {.seed = seed, .scheme = each.how}));
  if (p.from.one_pass) ask("one pass", p.from.one_pass(seed, size, k));
  return all;
}

/// Why intervals of a cell may cover more than they claim, and what would mend it; null for all others.
char const* may_be_wide(problem const& p, std::string const& question) {
  if (!p.exact.lattice) return nullptr;
  if (question.ends_with("median"))
    return "limits of a quantile of whole numbers are whole numbers too, and reach it nearly always";
  if (question.ends_with("bin"))
    return "a few equal states drawn evenly come out almost as often as they weigh; only expectation and probability know of "
           "that gain, so ask for the probability of the bin";
  return nullptr;
}

}  // namespace

TEST_CASE("where 95 % of the runs say sound, intervals of resampled ensembles cover what they claim") {
  cell pool, named;
  std::uint64_t promising = 0;
  print_heading();
  for (problem const& p : problems()) {
    if (!p.typical) continue;
    for (std::size_t const size : sizes) {
      for (std::size_t const k : {size / 4, 2 * size}) {
        // The short run: many slots from few states, and few from many.
        if (!honest() && (size == 10'000 || (size < k) != (size == 300))) continue;
        std::vector<std::string> names;
        ask_ensembles(p, 1, size, k, &names);
        // Of 10 000 states each run costs so much that 400 repeats, a smoke test, have to do.
        std::uint64_t const repeats = !honest() ? 1'000 : size < 10'000 ? 4'000 : 400;
        std::vector<cell> const cells = ask_often(repeats, [&](std::uint64_t seed) {
          return ask_ensembles(p, seed, size, k, nullptr);
        });
        for (std::size_t q = 0; q < cells.size(); ++q) {
          cell const& c = cells[q];
          bool const few = p.name.starts_with("16 groups");
          char const* const wide = may_be_wide(p, names[q]);
          (few ? named : pool) += c;
          bool more = false;
          for (std::size_t l = 0; l < levels.size(); ++l) more = more || (c.promises() && c.verdict_on(l) > 0);
          print(p.name + ", " + std::to_string(k), size, names[q], c, more && wide != nullptr ? wide : "");
          if (!c.promises()) continue;
          ++promising;
          INFO(p.name, ", ", k, " of ", size, " states, ", names[q]);
          for (std::size_t l = 0; l < levels.size(); ++l) {
            int const where = c.verdict_on(l);
            INFO("at level ", levels[l], ": ", c.hits[l], " hits of ", c.runs);
            CHECK_MESSAGE(where >= 0, "intervals are too narrow");
            if (wide == nullptr) CHECK_MESSAGE(where <= 0, "intervals are too wide");
          }
        }
        std::fflush(stdout);
      }
    }
  }
  std::printf("%llu cells with at least 95 %% sound runs; sound and off by more than four standard errors: %llu of %llu runs, "
              "and %llu of %llu from 16 groups\n",
              static_cast<unsigned long long>(promising), static_cast<unsigned long long>(pool.sound_and_far),
              static_cast<unsigned long long>(pool.runs), static_cast<unsigned long long>(named.sound_and_far),
              static_cast<unsigned long long>(named.runs));
  CHECK(promising > 0u);
  CHECK(1'000 * pool.sound_and_far <= pool.runs);
}

TEST_CASE("mean z^2 of resampled ensembles is near 1 with every scheme") {
  for (std::string const name : {"prior weights", "wide normal"})
    for (problem const& p : problems()) {
      if (p.name != name || (name == "wide normal" && !honest())) continue;
      constexpr std::size_t size = 2'000, k = 1'000;
      std::vector<std::string> names;
      ask_ensembles(p, 1, size, k, &names);
      std::vector<cell> const cells =
          ask_often(4'000, [&](std::uint64_t seed) { return ask_ensembles(p, seed, size, k, nullptr); });
      for (std::size_t q = 0; q < cells.size(); ++q) {
        if (names[q].ends_with("median")) continue;
        INFO(name, ", ", names[q]);
        std::printf("%-36s %6zu  %-24s mean z^2 %.3f\n", name.c_str(), k, names[q].c_str(), cells[q].mean_z2());
        CHECK(std::abs(cells[q].mean_z2() - 1.0) < 0.1);
      }
    }
}
