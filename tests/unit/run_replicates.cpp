// SPDX-License-Identifier: BSL-1.0
// Words from a source of a few independent randomisations: the replicates are the
// units of every error bar, kept and in one pass.

#include <doctest/doctest.h>

#include <array>
#include <bit>
#include <cmath>
#include <cstdint>
#include <memory>
#include <optional>
#include <span>
#include <string>
#include <vector>

#include <steelyard/core.hpp>

#include "law_questions.hpp"

namespace sy = steelyard;
using law::bits;
using law::close;

namespace {

/// Eight replicates: in each, the first word of its samples are a shifted regular
/// grid on the circle, the second another; further words are independent.
class shifted_grids final : public sy::word_source {
 public:
  explicit shifted_grids(std::uint64_t size) : each_(size / count) {}

  void fill(std::uint64_t seed, std::uint64_t sample, std::uint64_t first, std::span<std::uint64_t> out) const override {
    std::uint64_t const r = sample % count, i = sample / count;
    for (std::size_t k = 0; k < out.size(); ++k) {
      std::uint64_t const place = first + k;
      if (place < 2) {
        sy::draws shift(seed, r, sy::purpose::randomise, place);
        std::uint64_t const step = ~std::uint64_t{0} / each_ + 1, turn = place == 0 ? i : i * 377 % each_;
        out[k] = shift() + turn * step;  // modulo 2^64: around the circle
      } else {
        sy::draws other(seed, sample, sy::purpose::run, place);
        out[k] = other();
      }
    }
  }
  std::uint64_t replicates() const override { return count; }
  std::uint64_t replicate_of(std::uint64_t sample) const override { return sample % count; }
  bool allows(std::uint64_t size) const override { return size == each_ * count; }
  std::string sizes() const override { return std::to_string(each_ * count) + " only"; }

  static constexpr std::uint64_t count = 8;

 private:
  std::uint64_t each_;
};

sy::words grids(std::uint64_t size) { return std::make_shared<shifted_grids const>(size); }

double sum_of_two(sy::draws& draws) {
  double const x = draws.normal();
  return x + 0.1 * draws.normal();
}
sy::pipeline const problem{&sum_of_two, law::read_one};
double const prior_variance = 1.01;
double const exact_mean = prior_variance / (prior_variance + 1.0);

}  // namespace

TEST_CASE("a replicated run: the pooled ratio is the value, R - 1 degrees of freedom, the same bits in one pass") {
  sy::plan plan{.size = 8 * 987, .seed = 1, .source = grids(8 * 987)};
  auto const sample = problem.run(plan);
  CHECK(sample.how_drawn() == sy::how_drawn::replicated);
  auto const mean = sample.expectation(law::itself);
  CHECK(mean.degrees_of_freedom == 7.0);
  CHECK(mean.groups() == 8.0);
  CHECK(law::errors_off(mean, exact_mean) < 5.0);
  CHECK(law::errors_off(sample.log_evidence(), -0.5 * std::log(prior_variance + 1.0) - 0.5 / (prior_variance + 1.0)) < 5.0);
  CHECK((bits(law::ask_one_pass(problem, plan)) == bits(law::ask_one_pass(sample))));
  plan.threads = 3;
  CHECK((bits(law::ask_one_pass(problem, plan)) == bits(law::ask_one_pass(sample))));
  CHECK((bits(law::ask_everything(problem.run(plan))) == bits(law::ask_everything(sample))));
  plan.keep = sy::keeping::streams;
  CHECK((bits(law::ask_everything(problem.run(plan))) == bits(law::ask_everything(sample))));
}

TEST_CASE("the error of a replicated run by hand: se^2 = R/(R-1) sum over replicates of (sum W (f - mu))^2") {
  sy::plan const plan{.size = 8 * 100, .seed = 2, .source = grids(8 * 100)};
  auto const sample = problem.run(plan);
  double total = 0.0, top = 0.0;
  std::vector<double> w;
  for (double const l : sample.log_weights()) w.push_back(std::exp(l));
  for (std::size_t i = 0; i < sample.size(); ++i) {
    total += w[i];
    top += w[i] * sample.states()[i];
  }
  double const mean = top / total;
  std::array<double, 8> u{}, share{};
  for (std::size_t i = 0; i < sample.size(); ++i) {
    u[i % 8] += w[i] / total * (sample.states()[i] - mean);
    share[i % 8] += w[i] / total;
  }
  double squares = 0.0, fourth = 0.0, largest = 0.0;
  for (std::size_t r = 0; r < 8; ++r) {
    squares += u[r] * u[r];
    fourth += u[r] * u[r] * u[r] * u[r];
    largest = std::max(largest, share[r]);
  }
  auto const answer = sample.expectation(law::itself);
  CHECK(close(answer.value, mean, 1e-12));
  CHECK(close(answer.standard_error, std::sqrt(8.0 / 7.0 * squares), 1e-9));
  CHECK(close(answer.carriers, squares * squares / fourth, 1e-8));
  // Never seen, with the replicates as units: 1 - (1 - L)^(largest share of a replicate).
  auto const never = sample.probability(law::impossible_event);
  CHECK(never.never_seen());
  CHECK(close(never.error_interval(0.95).upper, 1.0 - std::pow(0.05, largest), 1e-10));
  CHECK((bits(problem.probability(plan, law::impossible_event)) == bits(never)));
}

TEST_CASE("balanced words are worth far more than their number") {
  sy::plan plan{.size = 8 * 2048, .seed = 3};
  auto const independent = problem.expectation(plan, law::itself);
  plan.source = grids(8 * 2048);
  auto const balanced = problem.expectation(plan, law::itself);
  CHECK(balanced.standard_error < 0.2 * independent.standard_error);
  CHECK(law::errors_off(balanced, exact_mean) < 5.0);
  CHECK(balanced.effective_size > 0.5 * independent.effective_size);
}

TEST_CASE("the error bar of a replicated run over many seeds: mean z^2 is that of Student's t with R - 1 degrees") {
  // E t^2 = 7/5 with 7 degrees of freedom; its own error over 400 seeds is 0.14 (E t^4 = 3 49 / (5 3)).
  double sum = 0.0;
  int const seeds = 400;
  for (int seed = 1; seed <= seeds; ++seed) {
    auto const mean = problem.expectation({.size = 8 * 64, .seed = seed, .source = grids(8 * 64)}, law::itself);
    double const z = (mean.value - exact_mean) / mean.standard_error;
    sum += z * z;
  }
  CHECK(sum / seeds > 1.4 - 5 * 0.14);
  CHECK(sum / seeds < 1.4 + 5 * 0.14);
}

TEST_CASE("runs set aside in a replicated run: one pass and kept the same, and every replicate counts its own") {
  auto const may_fail = [](sy::draws& draws) -> std::optional<double> {
    double const x = draws.normal();
    if (x > 1.0 && draws.chance(0.5)) return std::nullopt;
    return x;
  };
  sy::pipeline const failing{may_fail, law::read_one};
  sy::plan const plan{.size = 8 * 500, .seed = 4, .source = grids(8 * 500), .on_failure = sy::failures::set_aside};
  auto const sample = failing.run(plan);
  CHECK(sample.diagnosis().failed() > 100);
  CHECK((bits(law::ask_one_pass(failing, plan)) == bits(law::ask_one_pass(sample))));

  // The evidence by hand: failed runs are in the replicate they were drawn for.
  std::array<double, 8> part{};
  double total = 0.0;
  for (std::size_t i = 0; i < sample.size(); ++i) {
    double const w = std::exp(sample.log_weights()[i]);
    part[sample.sample_index(i) % 8] += w;
    total += w;
  }
  double squares = 0.0;
  for (double const w : part) squares += (w / total - 0.125) * (w / total - 0.125);
  CHECK(close(sample.log_evidence().value, std::log(total / 4000.0), 1e-10));
  CHECK(close(sample.log_evidence().standard_error, std::sqrt(8.0 / 7.0 * squares), 1e-8));
}

TEST_CASE("extending a replicated run is the longer run, where the source allows its size") {
  struct any_size : sy::word_source {
    void fill(std::uint64_t seed, std::uint64_t sample, std::uint64_t first, std::span<std::uint64_t> out) const override {
      for (std::size_t k = 0; k < out.size(); ++k) {
        sy::draws other(seed, sample, sy::purpose::run, first + k);
        out[k] = other();
      }
    }
    std::uint64_t replicates() const override { return 4; }
    std::uint64_t replicate_of(std::uint64_t sample) const override { return sample % 4; }
    bool allows(std::uint64_t size) const override { return size % 4 == 0; }
    std::string sizes() const override { return "multiples of 4"; }
  };
  sy::plan plan{.size = 1500, .seed = 5, .source = std::make_shared<any_size const>()};
  auto const longer = problem.extend(problem.run(plan), 1500);
  plan.size = 3000;
  CHECK((bits(law::ask_everything(longer)) == bits(law::ask_everything(problem.run(plan)))));
  CHECK(law::said<sy::bad_argument>([&] { problem.extend(longer, 1); }) ==
        "plan: size 3001 does not suit the source of words, which allows multiples of 4");
  plan.size = 17;
  std::string const words = "plan: size 17 does not suit the source of words, which allows multiples of 4";
  CHECK(law::said<sy::bad_argument>([&] { problem.run(plan); }) == words);
  CHECK(law::said<sy::bad_argument>([&] { problem.expectation(plan, law::itself); }) == words);
}
