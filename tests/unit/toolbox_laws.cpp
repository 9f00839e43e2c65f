// SPDX-License-Identifier: BSL-1.0
// Laws that every toolbox question obeys: the same bits in one pass and kept, on
// any threads; order, splitting, counts, shift and scale; an ensemble of every
// state once is the sample itself.

#include <doctest/doctest.h>

#include <algorithm>
#include <cmath>
#include <cstddef>
#include <cstdint>
#include <memory>
#include <span>
#include <stop_token>
#include <vector>

#include <steelyard/core.hpp>

#include "toolbox_support.hpp"

namespace sy = steelyard;
using law::close;

namespace {

sy::pipeline const problem{law::draw_normal, law::read_one};

struct ensemble {
  std::vector<double> states, prior;
  std::vector<std::uint64_t> counts;
  std::vector<std::uint32_t> groups;
};
ensemble made(std::size_t n, std::uint64_t seed, std::uint64_t largest_count = 4) {
  ensemble e;
  for (std::size_t i = 0; i < n; ++i) {
    sy::draws draws(seed, i);
    e.states.push_back(draws.normal());
    e.prior.push_back(draws.chance(0.05) ? 0.0 : draws.exponential(1.0));
    e.counts.push_back(1 + draws.index(largest_count));
    e.groups.push_back(static_cast<std::uint32_t>(draws.index(40)));
  }
  return e;
}
auto weighed(ensemble const& e, bool counts, bool groups) {
  return sy::weigh(e.states, law::read_one,
                   {.prior_weights = e.prior,
                    .counts = counts ? e.counts : std::vector<std::uint64_t>{},
                    .groups = groups ? e.groups : std::vector<std::uint32_t>{}});
}
void check_close(law::all_estimates const& a, law::all_estimates const& b, double relative = 1e-9) {
  REQUIRE(a.size() == b.size());
  for (std::size_t k = 0; k < a.size(); ++k) {
    CAPTURE(k);
    CAPTURE(a[k].value);
    CAPTURE(b[k].value);
    CAPTURE(a[k].standard_error);
    CAPTURE(b[k].standard_error);
    CHECK(close(a[k], b[k], relative));
  }
}

}  // namespace

TEST_CASE("toolbox: one pass gives the bits of the kept sample, on any threads and in any order") {
  for (std::uint64_t const size : {1u, 2u, 17u, 1000u, 1025u, 5000u, 20'001u}) {
    CAPTURE(size);
    auto const kept = law::toolbox_bits(law::ask_one_pass_toolbox(problem.run({.size = size, .seed = 1})));
    CHECK((law::toolbox_bits(law::ask_one_pass_toolbox(problem, {.size = size, .seed = 1})) == kept));
    CHECK((law::toolbox_bits(law::ask_one_pass_toolbox(problem, {.size = size, .seed = 1, .threads = 2})) == kept));
    CHECK((law::toolbox_bits(
               law::ask_one_pass_toolbox(problem, {.size = size, .seed = 1, .executor = law::backwards()})) == kept));
  }
}

TEST_CASE("toolbox: replicates are the groups of every question") {
  struct in_turn final
      : sy::word_source {  // eight replicates, each sample in the next; their first words agree in part
    void fill(std::uint64_t seed, std::uint64_t sample, std::uint64_t first,
              std::span<std::uint64_t> out) const override {
      for (std::size_t k = 0; k < out.size(); ++k) {
        sy::draws own(seed, sample, sy::purpose::run, first + k),
            shared(seed, sample % 8, sy::purpose::randomise, first + k);
        out[k] = (own() >> 1) + (shared() >> 3);
      }
    }
    std::uint64_t replicates() const override { return 8; }
    std::uint64_t replicate_of(std::uint64_t sample) const override { return sample % 8; }
  };
  sy::plan const plan{.size = 4000, .seed = 3, .source = std::make_shared<in_turn const>()};
  auto const kept = problem.run(plan);
  CHECK((law::toolbox_bits(law::ask_one_pass_toolbox(problem, plan)) ==
         law::toolbox_bits(law::ask_one_pass_toolbox(kept))));
  for (sy::estimate const& e : law::estimates_of(law::ask_toolbox(kept))) {
    if (e.never_seen() || e.always_seen()) continue;
    CHECK(e.groups() == 8.0);
    CHECK(e.degrees_of_freedom == 7.0);
  }
  std::vector<std::uint32_t> labels;
  for (std::uint32_t i = 0; i < 4000; ++i) labels.push_back(i % 8);
  auto const labelled =
      sy::weigh(std::vector<double>(kept.states().begin(), kept.states().end()), law::read_one, {.groups = labels});
  auto const a = labelled.correlation(law::itself, law::scaled_square),
             b = kept.correlation(law::itself, law::scaled_square);
  CHECK(close(a, b, 1e-10));  // eight equal groups: 1/(1 - sum m^2) is R/(R - 1)
}

TEST_CASE("toolbox: a run stopped, written out and taken up again gives the bits of one that never stopped") {
  struct memory final : sy::checkpoint_sink {
    void write(std::span<std::byte const> bytes) override { left.assign(bytes.begin(), bytes.end()); }
    std::vector<std::byte> read() override { return left; }
    std::vector<std::byte> left;
  };
  auto const sink = std::make_shared<memory>();
  sy::plan plan{.size = 30'000, .seed = 6, .checkpoint = sink};
  std::stop_source stop;
  plan.token = stop.get_token();
  plan.progress = [&](sy::progress_report const& p) {
    if (p.drawn >= 6000) stop.request_stop();
  };
  auto const part = law::ask_one_pass_toolbox(problem, plan);
  CHECK(part.drawn() < 30'000);
  CHECK_FALSE(sink->left.empty());
  sy::plan const rest{.size = 30'000, .seed = 6, .checkpoint = sink};
  auto const whole = law::toolbox_bits(law::ask_one_pass_toolbox(problem, {.size = 30'000, .seed = 6}));
  CHECK((law::toolbox_bits(law::ask_one_pass_toolbox(problem, rest)) == whole));
}

TEST_CASE("toolbox: the tail index does not depend on threads, order or keeping") {
  sy::pipeline const heavy{[](sy::draws& draws) { return draws.exponential(1.0); },
                           [](double x) { return sy::log_likelihood{0.6 * x}; }};
  sy::plan const plan{.size = 60'000, .seed = 5};
  auto const sampled = heavy.run(plan);
  double const index = sampled.diagnosis().tail_index();
  CHECK(index > 0.3);
  CHECK(heavy.estimate(plan, sy::health()).get<0>().tail_index() == index);
  CHECK(heavy.estimate({.size = 60'000, .seed = 5, .threads = 2}, sy::health()).diagnosis().tail_index() == index);
  std::vector<double> states(sampled.states().begin(), sampled.states().end());
  std::sort(states.begin(), states.end());
  CHECK(sy::weigh(states, heavy.weighter()).diagnosis().tail_index() == index);
  std::reverse(states.begin(), states.end());
  CHECK(sy::weigh(states, heavy.weighter()).diagnosis().tail_index() == index);
}

TEST_CASE("toolbox: the order of the samples changes nothing but rounding") {
  for (bool const grouped : {false, true}) {
    ensemble e = made(3000, 11);
    auto const before = weighed(e, true, grouped);
    std::vector<std::size_t> order(e.states.size());
    for (std::size_t i = 0; i < order.size(); ++i) order[i] = i;
    sy::draws source(3);
    std::shuffle(order.begin(), order.end(), source);
    ensemble other;
    for (std::size_t const i : order) {
      other.states.push_back(e.states[i]);
      other.prior.push_back(e.prior[i]);
      other.counts.push_back(e.counts[i]);
      other.groups.push_back(e.groups[i]);
    }
    auto const after = weighed(other, true, grouped);
    auto const ask = [](auto const& sample) {
      return law::estimates_of(
          std::apply([&](auto const&... each) { return sample.estimate(each..., sy::cumulative(law::itself)); },
                     law::one_pass_toolbox()));
    };
    check_close(ask(before), ask(after));
    // Parts of a shortest interval follow the order unless there are groups; the interval itself never does.
    auto const a = before.shortest_interval(law::itself, 0.8), b = after.shortest_interval(law::itself, 0.8);
    CHECK(a.lower.value == b.lower.value);
    CHECK(a.upper.value == b.upper.value);
    if (grouped) CHECK(close(a.width, b.width, 1e-9));
  }
}

TEST_CASE("toolbox: counts are the repeated sample, values and errors") {
  for (bool const grouped : {false, true})
    for (std::size_t const n : {40u, 1500u}) {
      CAPTURE(n);
      ensemble const e = made(n, 7, n == 40 ? 60 : 4);
      ensemble repeated;
      for (std::size_t i = 0; i < n; ++i)
        for (std::uint64_t c = 0; c < e.counts[i]; ++c) {
          repeated.states.push_back(e.states[i]);
          repeated.prior.push_back(e.prior[i]);
          repeated.groups.push_back(e.groups[i]);
        }
      auto const a = law::ask_toolbox(weighed(e, true, grouped)),
                 b = law::ask_toolbox(weighed(repeated, false, grouped));
      check_close(law::estimates_of(a), law::estimates_of(b));
      CHECK(a.diagnosis().tail_known() == b.diagnosis().tail_known());
      CHECK(a.diagnosis().tail_index() == b.diagnosis().tail_index());
    }
}

TEST_CASE("toolbox: a weight doubled is the sample added twice, for values") {
  ensemble const e = made(500, 9);
  ensemble twice = e;
  for (std::size_t i = 0; i < 100; ++i) {
    twice.states.push_back(e.states[i]);
    twice.prior.push_back(e.prior[i]);
  }
  ensemble doubled = e;
  for (std::size_t i = 0; i < 100; ++i) doubled.prior[i] *= 2.0;
  auto const a = weighed(twice, false, false), b = weighed(doubled, false, false);
  CHECK(close(a.moments(law::itself).skewness.value, b.moments(law::itself).skewness.value, 1e-10));
  CHECK(close(a.correlation(law::itself, law::scaled_square).value,
              b.correlation(law::itself, law::scaled_square).value, 1e-10));
  CHECK(a.shortest_interval(law::itself, 0.6).lower.value == b.shortest_interval(law::itself, 0.6).lower.value);
  CHECK(close(a.cumulative(law::itself).at(0.3).value, b.cumulative(law::itself).at(0.3).value, 1e-12));
  CHECK(close(a.histogram_2d(law::itself, law::scaled_square, sy::equal_bins(0.0, 1.0, 2), sy::equal_bins(0.0, 1.0, 2))
                  .probability(0, 0)
                  .value,
              b.histogram_2d(law::itself, law::scaled_square, sy::equal_bins(0.0, 1.0, 2), sy::equal_bins(0.0, 1.0, 2))
                  .probability(0, 0)
                  .value,
              1e-12));
}

TEST_CASE("toolbox: groups of one sample each are no groups") {
  ensemble e = made(2000, 13);
  for (std::size_t i = 0; i < e.groups.size(); ++i) e.groups[i] = static_cast<std::uint32_t>(7 * i);
  auto const plain = weighed(e, false, false), grouped = weighed(e, false, true);
  auto const ask = [](auto const& sample) {
    return law::estimates_of(
        std::apply([&](auto const&... each) { return sample.estimate(each..., sy::cumulative(law::itself)); },
                   law::one_pass_toolbox()));
  };
  check_close(ask(plain), ask(grouped), 1e-8);
}

TEST_CASE("toolbox: shift and scale of the readout") {
  auto const sample = weighed(made(2000, 17), true, false);
  for (double const scale : {3.0, -0.25, 1e9, 1e-9})
    for (double const shift : {0.0, -2.0, 100.0}) {
      CAPTURE(scale);
      CAPTURE(shift);
      auto const moved = [scale, shift](double x) { return scale * (x + shift); };
      auto const a = sample.moments(law::itself), b = sample.moments(moved);
      double const sign = scale < 0.0 ? -1.0 : 1.0, size = std::abs(scale);
      CHECK(close(b.mean.value, scale * (a.mean.value + shift), 1e-11));
      CHECK(close(b.sd.value, size * a.sd.value, 1e-11));
      CHECK(close(b.sd.standard_error, size * a.sd.standard_error, 1e-9));
      CHECK(close(b.skewness.value, sign * a.skewness.value, 1e-9));
      CHECK(close(b.skewness.standard_error, a.skewness.standard_error, 1e-9));
      CHECK(close(b.kurtosis.value, a.kurtosis.value, 1e-9));
      CHECK(close(b.kurtosis.standard_error, a.kurtosis.standard_error, 1e-9));
      CHECK(close(b.kurtosis.carriers, a.kurtosis.carriers, 1e-8));
      auto const r = sample.correlation(law::itself, law::scaled_square),
                 q = sample.correlation(moved, law::scaled_square);
      CHECK(close(q.value, sign * r.value, 1e-9));
      CHECK(close(q.standard_error, r.standard_error, 1e-9));
      auto const s = sample.shortest_interval(law::itself, 0.9), t = sample.shortest_interval(moved, 0.9);
      CHECK(close(t.width.value, size * s.width.value, 1e-10));
      CHECK(close(t.lower.value, scale * ((scale > 0.0 ? s.lower.value : s.upper.value) + shift), 1e-10));
      CHECK(close(t.width.standard_error, size * s.width.standard_error, 1e-8));
      CHECK(close(sample.cumulative(law::itself, {0.5}).shares[0].value,
                  scale > 0.0 ? sample.cumulative(moved, {scale * (0.5 + shift)}).shares[0].value
                              : 1.0 - sample.cumulative(moved, {scale * (0.5 + shift)}).shares[0].value,
                  1e-10));
    }
}

TEST_CASE("toolbox: the correlation is the covariance over both sds, and a readout's variance is its sd squared") {
  auto const sample = weighed(made(3000, 19), true, false);
  auto const c = sample.covariance([](double x) { return std::array{x, law::scaled_square(x)}; });
  auto const r = sample.correlation(law::itself, law::scaled_square);
  auto const m = sample.moments(law::itself);
  CHECK(close(c(0, 1).value / std::sqrt(c(0, 0).value * c(1, 1).value), r.value, 1e-12));
  CHECK(close(c.correlation(1, 0), r, 1e-10));
  CHECK(close(c(0, 0).value, m.sd.value * m.sd.value, 1e-12));
  CHECK(close(c(0, 0).standard_error, 2.0 * m.sd.value * m.sd.standard_error, 1e-10));
  CHECK(close(sample.covariance(law::itself)(0, 0), c(0, 0), 1e-12));
  CHECK(close(sample.moments(law::itself).mean, sample.expectation(law::itself), 1e-10));
}

TEST_CASE("toolbox: cells of a histogram in two dimensions add up to the one in one dimension") {
  auto const sample = weighed(made(3000, 21), true, false);
  auto const x = sy::equal_bins(-1.0, 1.0, 4);
  auto const both = sample.histogram_2d(law::itself, law::scaled_square, x, sy::equal_bins(0.0, 0.4, 5));
  auto const one = sample.histogram(law::itself, x);
  double inside = 0.0, area = 0.0;
  for (std::size_t i = 0; i < 4; ++i) {
    double row = 0.0;
    for (std::size_t j = 0; j < 5; ++j) {
      row += both.probability(i, j).value;
      area += both.density(i, j).value * 0.5 * 0.08;
    }
    inside += row;
    CHECK(row <= one.probability(i).value + 1e-12);
  }
  CHECK(close(inside + both.outside().value, 1.0, 1e-12));
  CHECK(close(area, inside, 1e-12));
  CHECK(close(both.x_below(), one.below(), 1e-10));
  CHECK(close(both.x_above(), one.above(), 1e-10));
  auto const wide = sample.histogram_2d(law::itself, law::scaled_square, x, sy::equal_bins(0.0, 1e6, 1));
  for (std::size_t i = 0; i < 4; ++i) CHECK(close(wide.probability(i, 0), one.probability(i), 1e-10));
}

TEST_CASE("toolbox: F at chosen points is the step function there and the probability of lying at or below") {
  for (bool const grouped : {false, true}) {
    auto const sample = weighed(made(3000, 23), true, grouped);
    std::vector<double> const points{-3.9, -0.3, 0.0, 0.7, 5.0};
    auto const steps = sample.cumulative(law::itself);
    auto const at = sample.cumulative(law::itself, points);
    for (std::size_t j = 0; j < points.size(); ++j) {
      double const x = points[j];
      CAPTURE(x);
      CHECK(close(at.shares[j], steps.at(x), 1e-9));
      CHECK(close(at.shares[j], sample.probability([x](double f) { return f <= x; }), 1e-9));
    }
    CHECK(steps.at(steps.value(100)).value == steps.step(100).value);
    CHECK(steps.step(steps.size() - 1).always_seen());
    CHECK(steps.at(-50.0).never_seen());
    CHECK(close(steps.quantile(0.25), sample.quantile(law::itself, 0.25), 1e-12));
  }
}

TEST_CASE("toolbox: an ensemble that holds every state once answers like the sample") {
  ensemble e = made(800, 25);
  e.prior.assign(800, 1.0);
  auto const flat = [](double) { return sy::likelihood{1.0}; };
  auto const sample = sy::weigh(e.states, flat);
  auto const all = sample.resample(800, {.scheme = sy::scheme::systematic});
  CHECK(all.copies().size() == 800);
  check_close(law::estimates_of(law::ask_toolbox(sample)), law::estimates_of(law::ask_toolbox(all.as_sample())));
  auto const weighted = weighed(made(800, 27), false, false);
  auto const kept = weighted.resample(5000, {.scheme = sy::scheme::priority});  // more than there are: each once, exact
  check_close(law::estimates_of(
                  std::apply([&](auto const&... each) { return weighted.estimate(each...); }, law::one_pass_toolbox())),
              law::estimates_of(
                  std::apply([&](auto const&... each) { return kept.estimate(each...); }, law::one_pass_toolbox())),
              1e-2);  // the parent counts its states of weight zero among n in n/(n-1)
}
