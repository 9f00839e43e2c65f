// SPDX-License-Identifier: BSL-1.0
// legs: plain
// Tempered runs beside closed forms, moves of the user's own, and the same bits.

#include <doctest/doctest.h>

#include <array>
#include <cmath>
#include <cstddef>
#include <cstdint>
#include <string>

#include <steelyard/tempered.hpp>

#include "harder_support.hpp"
#include "law_support.hpp"

namespace sy = steelyard;
using harder::agrees;
using harder::conjugate;
using harder::first_of;
using law::said;

namespace {

template <class X>
law::all_bits bits_of(sy::weighted_sample<X> const& sample) {
  law::all_bits all;
  law::put(all, sample.log_evidence());
  law::put(all, sample.expectation(&first_of<4>));
  for (auto const& x : sample.states()) law::put(all, x[0]);
  all.push_back(sample.sampler_calls());
  return all;
}

using four = conjugate<4>;
sy::tempered_plan small(std::uint64_t seed = 1) { return {.seed = seed, .chains = 50, .draws = 1000}; }

}  // namespace

TEST_CASE("conjugate readings: evidence, mean and spread as in closed form") {
  conjugate<1> const one{1e-3};
  auto const narrow = sy::run_tempered(sy::pipeline{&conjugate<1>::sampler, one}, {.seed = 1});
  agrees(narrow.log_evidence(), one.log_evidence());
  agrees(narrow.expectation(&first_of<1>), one.mean());
  CHECK(narrow.how_drawn() == sy::how_drawn::lineages);
  CHECK(narrow.diagnosis().verdict() == sy::verdict::sound);
  CHECK(narrow.diagnosis().lineages() >= 20.0);
  // The whole distribution: its spread, and a quantile.
  auto const shape = narrow.moments(&first_of<1>);
  agrees(shape.sd, one.sd());
  auto const upper = narrow.quantile(&first_of<1>, 0.8413447460685429);
  CHECK(std::abs(upper.value - (one.mean() + one.sd())) <= 5.0 * upper.standard_error);

  conjugate<16> const many{0.1};
  auto const wide = sy::run_tempered(sy::pipeline{&conjugate<16>::sampler, many}, {.seed = 1, .chains = 100});
  agrees(wide.log_evidence(), many.log_evidence());
  agrees(wide.expectation(&first_of<16>), many.mean());
}

TEST_CASE("no rung is spent on a sliver that the last step could take along") {
  // In units of the variance that a step to the wanted share costs, 1/share - 1, the last one may cost 1.5.
  CHECK(sy::detail::enough_at_last(0.5, 0.5));
  CHECK(sy::detail::enough_at_last(0.401, 0.5));
  CHECK(!sy::detail::enough_at_last(0.399, 0.5));
  CHECK(!sy::detail::enough_at_last(0.85, 0.9));
  CHECK(sy::detail::enough_at_last(0.86, 0.9));
  CHECK(!sy::detail::enough_at_last(0.0, 0.5));
  // One word read with deviation s: the precision 1/s^2 + 1 grows by at most q a rung, where sqrt(2 q - 1) / q is the
  // share: 7.46 for a half. To q^14 are 14 rungs were the reading 0; being 0.5 it takes a little more, and no rung is added.
  double const q = 4.0 + 2.0 * std::sqrt(3.0), s = std::pow(q, -7.0);
  int rungs = 0;
  sy::tempered_plan how{.seed = 1};
  how.progress = [&rungs](sy::progress_report const&) { ++rungs; };
  auto const sample = sy::run_tempered(sy::pipeline{&conjugate<1>::sampler, conjugate<1>{s}}, how);
  CHECK(rungs == 14);
  agrees(sample.log_evidence(), conjugate<1>{s}.log_evidence());
}

TEST_CASE("one seed gives one sample, on any number of threads") {
  sy::pipeline const pipe{&four::sampler, four{0.03}};
  auto how = small();
  auto const alone = bits_of(sy::run_tempered(pipe, how));
  how.threads = 2;
  CHECK(bits_of(sy::run_tempered(pipe, how)) == alone);
  how.threads = 1;
  how.seed = 2;
  CHECK(bits_of(sy::run_tempered(pipe, how)) != alone);
}

TEST_CASE("words kept in place of states make the same states again, and count") {
  sy::pipeline const pipe{&four::sampler, four{0.03}};
  auto how = small();
  auto const kept = sy::run_tempered(pipe, how);
  how.keep = sy::keeping::streams;
  auto const again = sy::run_tempered(pipe, how);
  auto const before = again.sampler_calls();
  CHECK(before == kept.sampler_calls());
  auto const a = kept.values(&first_of<4>), b = again.values(&first_of<4>);
  REQUIRE(a.size() == b.size());
  CHECK(a == b);
  CHECK(again.sampler_calls() == before + a.size());
  CHECK(said<sy::not_kept>([&] { (void)again.states(); }).find("kept its streams only") != std::string::npos);
}

TEST_CASE("a block of words moved together, and an exact draw that is always accepted") {
  // Two words decide a direction and a radius on which the likelihood depends together; a third is read alone.
  auto const sampler = [](sy::draws& draws) {
    std::array<double, 3> x{};
    for (double& v : x) v = draws.normal();
    return x;
  };
  double const s = 0.05;
  auto const weighter = [s](std::array<double, 3> const& x) {
    double const sum = 1.0 - (x[0] + x[1]), alone = 0.5 - x[2];
    return sy::log_likelihood{-0.5 * (sum * sum + alone * alone) / (s * s)};
  };
  // x0 + x1 has variance 2; mean of x0 given the sum read as 1 is 1 / (2 + s^2).
  double const log_z = 0.5 * (std::log(s * s / (2.0 + s * s)) - 1.0 / (2.0 + s * s) + std::log(s * s / (1.0 + s * s)) -
                              0.25 / (1.0 + s * s));
  sy::pipeline const pipe{sampler, weighter};
  auto const x0 = [](std::array<double, 3> const& x) { return x[0]; };
  auto const x2 = [](std::array<double, 3> const& x) { return x[2]; };

  auto const together = sy::run_tempered(pipe, small(), sy::refresh_together{0, 2});
  agrees(together.log_evidence(), log_z);
  agrees(together.expectation(x0), 1.0 / (2.0 + s * s));

  // The third word, given the reading to the power b, is normal with precision 1 + b/s^2.
  std::uint64_t drawn = 0;
  auto const exactly = [&drawn, s](std::array<double, 3> const& x, double power, sy::draws& draws, sy::block_words& block) {
    ++drawn;
    CHECK(block.size() == 1u);
    CHECK(std::abs(block.normal(0) - x[2]) <= 1e-12 * (1.0 + std::abs(x[2])));
    double const precision = 1.0 + power / (s * s);
    block.set_normal(0, 0.5 * power / (s * s) / precision + draws.normal() / std::sqrt(precision));
  };
  auto const gibbs = sy::run_tempered(pipe, small(), sy::exact_draw(2, 1, exactly));
  CHECK(drawn > 100);  // a share of the calls that no move falls short of
  agrees(gibbs.log_evidence(), log_z);
  agrees(gibbs.expectation(x2), 0.5 / (1.0 + s * s));
  agrees(gibbs.expectation(x0), 1.0 / (2.0 + s * s));
}

TEST_CASE("an exact draw is accepted whatever the likelihood says") {
  // It writes one and the same word: were acceptance left to the likelihood, the chain would stay where it is likelier.
  auto const sampler = [](sy::draws& draws) { return draws.uniform(); };
  auto const weighter = [](double u) { return sy::log_likelihood{-40.0 * u}; };
  std::uint64_t asked = 0, elsewhere = 0;
  auto const to_the_far_end = [&](double u, double, sy::draws&, sy::block_words& block) {
    ++asked;
    if (u < 0.98) ++elsewhere;
    block.set_uniform(0, 0.99);
  };
  auto const sample = sy::run_tempered(sy::pipeline{sampler, weighter}, small(), sy::exact_draw(0, 1, to_the_far_end));
  CHECK(asked > 0);
  CHECK(elsewhere > 0);
  std::uint64_t there = 0;
  for (double const u : sample.values([](double u) { return u; }))
    if (u > 0.98 && u < 1.0) ++there;
  CHECK(there > 0);
}

TEST_CASE("hard zeros: the share of possible draws is the first rung") {
  // Possible in the upper tenth alone, and sharp there: Z = integral over (0.9, 1) of e^(-400 (u - 0.9)).
  auto const sampler = [](sy::draws& draws) { return draws.uniform(); };
  auto const weighter = [](double u) {
    return u > 0.9 ? sy::log_likelihood{-400.0 * (u - 0.9)} : sy::log_likelihood{-INFINITY};
  };
  auto const sample = sy::run_tempered(sy::pipeline{sampler, weighter}, small());
  agrees(sample.log_evidence(), std::log((1.0 - std::exp(-40.0)) / 400.0));
  agrees(sample.expectation([](double u) { return u; }), 0.9 + 1.0 / 400.0);
  // The share of a tenth alone has a standard error of 3 / sqrt(1000) in the logarithm; the whole cannot be surer.
  CHECK(sample.log_evidence().standard_error > 0.09);

  // Nothing but zeros and ones: the evidence is the share itself.
  auto const cut = [](double u) { return u > 0.7 ? sy::likelihood{1.0} : sy::likelihood{0.0}; };
  auto const share = sy::run_tempered(sy::pipeline{sampler, cut}, small());
  agrees(share.log_evidence(), std::log(0.3));
  CHECK(share.log_evidence().standard_error == doctest::Approx(std::sqrt(0.7 / 0.3 / 1000)).epsilon(0.1));

  auto const never = [](double) { return sy::likelihood{0.0}; };
  auto const words = said<sy::no_likelihood>([&] { sy::run_tempered(sy::pipeline{sampler, never}, small()); });
  CHECK(words.find("none of the 1000 draws from the prior that were tried") != std::string::npos);
  CHECK(words.find("plan.draws") != std::string::npos);
}

TEST_CASE("frozen settings: about twice the calls, the same answer, and another sample") {
  sy::pipeline const pipe{&four::sampler, four{0.03}};
  sy::tempered_plan how{.seed = 1};  // 50 chains leave about 20 lineages: too near the limit
  auto const adapted = sy::run_tempered(pipe, how);
  how.frozen = true;
  auto const frozen = sy::run_tempered(pipe, how);
  agrees(frozen.log_evidence(), four{0.03}.log_evidence());
  agrees(frozen.expectation(&first_of<4>), four{0.03}.mean());
  CHECK(frozen.sampler_calls() > adapted.sampler_calls() * 3 / 2);
  CHECK(frozen.log_evidence().value != adapted.log_evidence().value);
}

TEST_CASE("samplers that use other numbers of words each time") {
  // A Poisson number of exponential sizes, their sum read exactly enough to matter; P(no size) is e^-2.
  auto const sampler = [](sy::draws& draws) {
    double left = 2.0, sum = 0.0;
    while ((left += std::log(draws.uniform())) > 0.0) sum += draws.exponential(1.0);
    return sum;
  };
  double const sd = 0.01;
  auto const weighter = [sd](double sum) {
    double const z = (2.5 - sum) / sd;
    return sy::log_likelihood{-0.5 * z * z};
  };
  // Density of the sum at x: e^-(2 + x) sum_k 2^k x^(k-1) / (k! (k-1)!), nearly even over a hundredth.
  double density = 0.0, term = 2.0;
  for (int k = 1; k < 60; ++k) {
    density += term;
    term *= 2.0 * 2.5 / (static_cast<double>(k) * static_cast<double>(k + 1));
  }
  density *= std::exp(-4.5);
  auto const sample = sy::run_tempered(sy::pipeline{sampler, weighter}, {.seed = 1, .chains = 100});
  auto const z = sample.log_evidence();
  CHECK(std::abs(z.value - std::log(density * sd * std::sqrt(2.0 * 3.14159265358979324))) <= 5.0 * z.standard_error + 1e-3);
  CHECK(z.standard_error < 0.3);
}

