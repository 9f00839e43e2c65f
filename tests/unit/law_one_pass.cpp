// SPDX-License-Identifier: BSL-1.0
// One pass and a kept sample, on any threads and any executor, in any rounds: the
// same bits for the same seed.

#include <doctest/doctest.h>

#include <chrono>
#include <cstdint>
#include <memory>
#include <optional>
#include <span>
#include <stop_token>
#include <vector>

#include <steelyard/core.hpp>

#include "law_questions.hpp"

namespace sy = steelyard;
using law::bits;

namespace {

sy::pipeline const problem{law::draw_normal, law::read_one};

std::optional<double> may_fail(sy::draws& draws) {
  double const x = draws.normal();
  if (draws.chance(0.03)) return std::nullopt;
  return x;
}
/// States beyond 1.5 are impossible.
sy::likelihood cut(double x) { return sy::likelihood{x < 1.5 ? 2.0 + x * x : 0.0}; }

std::vector<std::uint64_t> const sizes{1, 2, 15, 16, 17, 63, 1000, 1023, 1024, 1025, 2048, 4095, 4097, 5000, 16385, 20'001};

}  // namespace

TEST_CASE("one pass gives the bits of the kept sample, whatever the size") {
  for (std::uint64_t const size : sizes) {
    CAPTURE(size);
    sy::plan const plan{.size = size, .seed = 1};
    CHECK(law::alike(bits(law::ask_one_pass(problem, plan)), bits(law::ask_one_pass(problem.run(plan)))));
  }
}

TEST_CASE("one pass gives the bits of the kept sample with runs set aside and states of weight zero") {
  sy::pipeline const failing{may_fail, cut};
  for (std::uint64_t const size : sizes) {
    if (size < 15) continue;
    CAPTURE(size);
    sy::plan const plan{.size = size, .seed = 2, .on_failure = sy::failures::set_aside};
    auto const kept = failing.run(plan);
    auto const streamed = law::ask_one_pass(failing, plan);
    CHECK(streamed.drawn() == kept.drawn());
    CHECK(streamed.diagnosis().failed() == kept.diagnosis().failed());
    CHECK(law::alike(bits(streamed), bits(law::ask_one_pass(kept))));
  }
}

TEST_CASE("one pass gives the bits of the kept sample where whole blocks at the end fail") {
  // The first words of each sample are its number: samples from 2100 on fail.
  struct numbered : sy::word_source {
    void fill(std::uint64_t seed, std::uint64_t sample, std::uint64_t first, std::span<std::uint64_t> out) const override {
      for (std::size_t k = 0; k < out.size(); ++k) {
        sy::draws other(seed, sample, sy::purpose::run, first + k);
        out[k] = first + k == 0 ? sample : other();
      }
    }
  };
  auto const fails_late = [](sy::draws& draws) -> std::optional<double> {
    if (draws() >= 2100) return std::nullopt;
    return draws.normal();
  };
  sy::pipeline const failing{fails_late, law::read_one};
  sy::plan const plan{.size = 9000, .source = std::make_shared<numbered const>(), .on_failure = sy::failures::set_aside};
  auto const kept = failing.run(plan);
  CHECK(kept.size() == 2100);
  CHECK(law::alike(bits(law::ask_one_pass(failing, plan)), bits(law::ask_one_pass(kept))));
}

TEST_CASE("any number of threads and any executor give the same bits, kept and in one pass") {
  sy::plan plan{.size = 40'007, .seed = 3};
  auto const kept = bits(law::ask_everything(problem.run(plan)));
  auto const streamed = bits(law::ask_one_pass(problem, plan));
  for (unsigned threads : {2u, 7u, 0u}) {
    CAPTURE(threads);
    plan.threads = threads;
    CHECK((bits(law::ask_everything(problem.run(plan))) == kept));
    CHECK((bits(law::ask_one_pass(problem, plan)) == streamed));
  }
  plan.threads = 1;
  for (sy::executor const& execute : {law::backwards(), law::by_async()}) {
    plan.executor = execute;
    CHECK((bits(law::ask_everything(problem.run(plan))) == kept));
    CHECK((bits(law::ask_one_pass(problem, plan)) == streamed));
  }
}

TEST_CASE("a pilot that must look far for its entries sees the same ones on any threads") {
  auto const rarely = [](double x) { return sy::likelihood{x > 1.3 ? 1.0 : 0.0}; };  // one in ten
  sy::pipeline const sparse{law::draw_normal, rarely};
  sy::plan plan{.size = 70'001, .seed = 1};
  auto const alone = bits(sparse.histogram(plan, law::itself));
  CHECK((bits(sparse.run(plan).histogram(law::itself)) == alone));
  plan.threads = 3;
  CHECK((bits(sparse.histogram(plan, law::itself)) == alone));
  plan.executor = law::backwards();
  CHECK((bits(sparse.histogram(plan, law::itself)) == alone));
}

TEST_CASE("states kept and streams kept give the same bits") {
  sy::plan plan{.size = 9'999, .seed = 4};
  auto const states = bits(law::ask_everything(problem.run(plan)));
  plan.keep = sy::keeping::streams;
  CHECK((bits(law::ask_everything(problem.run(plan))) == states));
  plan.threads = 2;
  CHECK((bits(law::ask_everything(problem.run(plan))) == states));
  sy::pipeline const failing{may_fail, cut};
  plan.on_failure = sy::failures::set_aside;
  auto const aside = bits(law::ask_everything(failing.run(plan)));
  plan.keep = sy::keeping::states;
  CHECK((bits(law::ask_everything(failing.run(plan))) == aside));
}

TEST_CASE("the questions asked beside it change no answer") {
  sy::plan const plan{.size = 5'000, .seed = 5};
  auto const sample = problem.run(plan);
  auto const alone = bits(sample.expectation(law::itself));
  CHECK(law::alike(bits(law::ask_everything(sample).get<0>()), alone));
  CHECK(law::alike(bits(problem.expectation(plan, law::itself)), alone));
  CHECK(law::alike(bits(problem.probability(plan, law::above_one)), bits(sample.probability(law::above_one))));
  CHECK(law::alike(bits(problem.log_evidence(plan)), bits(sample.log_evidence())));
  CHECK(law::alike(bits(problem.ratio(plan, law::itself, law::squared)), bits(sample.ratio(law::itself, law::squared))));
  CHECK(law::alike(bits(problem.difference(plan, law::itself, law::squared)), bits(sample.difference(law::itself, law::squared))));
  CHECK(law::alike(bits(problem.histogram(plan, law::itself)), bits(sample.histogram(law::itself))));
  CHECK(law::alike(bits(sample.interval(law::itself, 0.9)), bits(law::ask_everything(sample).get<14>())));
}

TEST_CASE("a run that was stopped gives the bits of a run with the size it reached") {
  std::stop_source stop;
  int rounds = 0;
  sy::plan plan{.size = 1'000'000, .seed = 6, .threads = 2};
  plan.token = stop.get_token();
  plan.progress = [&](sy::progress_report const&) {
    if (++rounds == 3) stop.request_stop();
  };
  auto const stopped = problem.run(plan);
  CHECK(stopped.drawn() < 1'000'000);
  CHECK(stopped.drawn() % 1024 == 0);
  sy::plan const again{.size = stopped.drawn(), .seed = 6};
  CHECK((bits(law::ask_everything(problem.run(again))) == bits(law::ask_everything(stopped))));
  CHECK((bits(law::ask_one_pass(problem, again)) == bits(law::ask_one_pass(stopped))));

  std::stop_source other;
  rounds = 0;
  plan.token = other.get_token();
  plan.progress = [&](sy::progress_report const&) {
    if (++rounds == 2) other.request_stop();
  };
  auto const streamed = law::ask_one_pass(problem, plan);
  CHECK((bits(law::ask_one_pass(problem, {.size = streamed.drawn(), .seed = 6})) == bits(streamed)));
}

TEST_CASE("a time limit only decides how many rounds are done") {
  sy::plan plan{.size = 100'000'000, .seed = 7};
  plan.time_limit = std::chrono::milliseconds(20);
  auto const limited = law::ask_one_pass(problem, plan);
  CHECK(limited.drawn() < 100'000'000);
  CHECK(limited.drawn() % 1024 == 0);
  CHECK((bits(law::ask_one_pass(problem, {.size = limited.drawn(), .seed = 7, .threads = 2})) == bits(limited)));
}
