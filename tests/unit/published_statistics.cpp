// SPDX-License-Identifier: BSL-1.0
// legs: plain
// NIST Statistical Reference Datasets, univariate summary statistics: certified means
// and standard deviations, with all weights equal, with every log-weight shifted by
// +-700, as integer counts and as weights.

#include <doctest/doctest.h>

#include <cmath>
#include <cstdint>
#include <string>
#include <vector>

#include <steelyard/core.hpp>

#include "law_questions.hpp"
#include "published_data.hpp"

namespace sy = steelyard;

namespace {

struct certified {
  std::string name;
  std::vector<double> data;
  double mean, sd;
  double mean_digits, sd_digits;  ///< how close a double can come: relative
};

std::vector<certified> sets() {
  auto const file = [](char const* name) { return published::read(name).numbers("y"); };
  std::vector<double> low{1.2}, high{10000000.2};
  for (int i = 0; i < 500; ++i) {
    low.insert(low.end(), {1.1, 1.3});
    high.insert(high.end(), {10000000.1, 10000000.3});
  }
  return {{"Lottery", file("nist_lottery.csv"), 518.958715596330, 291.699727470969, 1e-14, 1e-14},
          {"Lew", file("nist_lew.csv"), -177.435000000000, 277.332168044316, 1e-14, 1e-14},
          {"Mavro", file("nist_mavro.csv"), 2.00185600000000, 0.000429123454003053, 1e-15, 2e-13},
          {"Michelso", file("nist_michelso.csv"), 299.852400000000, 0.0790105478190518, 1e-15, 2e-13},
          {"NumAcc1", {10000001.0, 10000003.0, 10000002.0}, 10000002.0, 1.0, 1e-15, 1e-14},
          {"NumAcc2", low, 1.2, 0.1, 1e-15, 1e-14},
          // The inputs of NumAcc4 are rounded when stored; the exact sd of what is stored is 0.10000000055879354.
          {"NumAcc4", high, 10000000.2, 0.10000000055879354, 1e-15, 1e-13}};
}

template <class Sample>
void check(Sample const& sample, certified const& set) {
  auto const [mean, spread, moments] =
      sample.estimate(sy::expectation(law::itself), law::spread(law::itself), sy::moments(law::itself));
  double const n = static_cast<double>(sample.drawn());
  CHECK(law::close(mean.value, set.mean, set.mean_digits));
  CHECK(law::close(moments.mean.value, set.mean, set.mean_digits));
  CHECK(law::close(moments.sd.value, set.sd, set.sd_digits));
  CHECK(law::close(mean.standard_error, set.sd / std::sqrt(n), set.sd_digits * 10.0));
  // A user's estimator that updates its mean entry by entry, each time rounded to the mean's own size.
  CHECK(law::close(spread.value, set.sd, set.sd_digits * 10.0 + 4.0 * 0x1p-53 * std::abs(set.mean / set.sd)));
  CHECK(law::close(mean.effective_size, n, 1e-13));
}

}  // namespace

TEST_CASE("NIST StRD: certified mean and standard deviation, whatever constant the log-weights share") {
  for (certified const& set : sets())
    for (double const shift : {0.0, 700.0, -700.0}) {
      CAPTURE(set.name);
      CAPTURE(shift);
      check(sy::weigh(set.data, [shift](double) { return sy::log_likelihood{shift}; }), set);
    }
}

TEST_CASE("NIST StRD: integer multiplicities as counts give value, sd and error of the repeated data") {
  certified const near{"NumAcc2", {1.2, 1.1, 1.3}, 1.2, 0.1, 1e-15, 1e-14};
  certified const far{"NumAcc4", {10000000.2, 10000000.1, 10000000.3}, 10000000.2, 0.10000000055879354, 1e-15, 1e-13};
  for (certified const& set : {near, far})
    for (double const shift : {0.0, 700.0, -700.0}) {
      CAPTURE(set.name);
      CAPTURE(shift);
      check(sy::weigh(set.data, [shift](double) { return sy::log_likelihood{shift}; }, {.counts = {1, 500, 500}}), set);
    }
}

TEST_CASE("NIST StRD: the same multiplicities as weights share the value alone") {
  std::vector<double> const three{1.2, 1.1, 1.3};
  auto const sample = sy::weigh(three, [](double) { return sy::likelihood{1.0}; }, {.prior_weights = {1.0, 500.0, 500.0}});
  auto const mean = sample.expectation(law::itself);
  CHECK(law::close(mean.value, 1.2, 1e-15));
  CHECK(law::close(mean.effective_size, 1001.0 * 1001.0 / 500001.0, 1e-13));  // 2.004
  CHECK(law::close(mean.effective_size, 2.004, 1e-4));
  CHECK(mean.standard_error > 0.07);
  CHECK(mean.verdict() == sy::verdict::broken);
}

TEST_CASE("NIST StRD: a set as long as several blocks, in a pipeline, kept and in one pass") {
  // NumAcc4 three times over: blocks are merged about their own means; the mean stays, sd^2 changes by n - 1.
  certified set = sets().back();
  std::vector<double> const once = set.data;
  for (int k = 0; k < 2; ++k) set.data.insert(set.data.end(), once.begin(), once.end());
  set.sd *= std::sqrt(3.0 * 1000.0 / 3002.0);
  check(sy::weigh(set.data, [](double) { return sy::likelihood{1.0}; }), set);

  struct numbered : sy::word_source {  // the first word of a sample is its number
    void fill(std::uint64_t, std::uint64_t sample, std::uint64_t, std::span<std::uint64_t> out) const override {
      for (std::uint64_t& word : out) word = sample;
    }
  };
  auto const in_turn = [&](sy::draws& draws) { return set.data[static_cast<std::size_t>(draws())]; };
  sy::pipeline const problem{in_turn, [](double) { return sy::log_likelihood{-700.0}; }};
  sy::plan const plan{.size = set.data.size(), .source = std::make_shared<numbered const>()};
  check(problem.run(plan), set);
  auto const mean = problem.expectation(plan, law::itself);
  CHECK(law::close(mean.value, set.mean, set.mean_digits));
  CHECK(law::close(mean.standard_error, set.sd / std::sqrt(3003.0), 1e-12));
}
