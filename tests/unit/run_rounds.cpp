// SPDX-License-Identifier: BSL-1.0
// Rounds: progress, stop tokens and time limits. They decide how far a run goes and
// what it says about that, never a bit of its answers.

#include <doctest/doctest.h>

#include <atomic>
#include <chrono>
#include <cstdint>
#include <optional>
#include <stdexcept>
#include <stop_token>
#include <string>
#include <vector>

#include <steelyard/core.hpp>

#include "law_support.hpp"

namespace sy = steelyard;
using law::bits;
using law::holds;
using law::said;

namespace {

sy::pipeline const problem{law::draw_normal, law::read_one};

std::string stopped_text(sy::diagnosis const& health) {
  for (sy::finding const& each : health.findings())
    if (each.kind == sy::finding_kind::stopped) return each.text;
  return {};
}
std::optional<double> may_fail(sy::draws& draws) {
  double const x = draws.normal();
  if (draws.chance(0.25)) return std::nullopt;
  return x;
}

}  // namespace

TEST_CASE("progress rises to the planned size, told by one thread at a time") {
  for (unsigned threads : {1u, 3u}) {
    std::vector<sy::progress_report> told;
    std::atomic<int> inside{0};
    sy::plan plan{.size = 50'000, .seed = 1, .threads = threads, .on_failure = sy::failures::set_aside};
    plan.progress = [&](sy::progress_report const& report) {
      CHECK(++inside == 1);
      told.push_back(report);
      --inside;
    };
    auto const sample = sy::pipeline{may_fail, law::read_one}.run(plan);
    REQUIRE(!told.empty());
    CHECK(told.back().drawn == 50'000);
    CHECK(told.back().failed == sample.diagnosis().failed());
    CHECK(told.size() > 2);
    for (std::size_t k = 0; k < told.size(); ++k) {
      CHECK(told[k].planned == 50'000);
      CHECK(told[k].elapsed.count() >= 0);
      if (k == 0) continue;
      CHECK(told[k].drawn > told[k - 1].drawn);
      CHECK(told[k].failed >= told[k - 1].failed);
      CHECK(told[k].elapsed >= told[k - 1].elapsed);
    }
    auto const kept_reports = told.size();
    told.clear();
    sy::pipeline{may_fail, law::read_one}.estimate(plan, sy::log_evidence());
    CHECK(told.back().drawn == 50'000);
    CHECK(told.back().failed == sample.diagnosis().failed());
    CHECK(kept_reports > 0);
  }
}

TEST_CASE("progress changes no bit") {
  sy::plan plan{.size = 30'000, .seed = 2};
  auto const quiet = bits(problem.run(plan).expectation(law::itself));
  plan.progress = [](sy::progress_report const&) {};
  CHECK((bits(problem.run(plan).expectation(law::itself)) == quiet));
  CHECK((bits(problem.expectation(plan, law::itself)) == quiet));
  plan.time_limit = std::chrono::hours(1);
  std::stop_source never;
  plan.token = never.get_token();
  CHECK((bits(problem.run(plan).expectation(law::itself)) == quiet));
  CHECK((bits(problem.expectation(plan, law::itself)) == quiet));
  CHECK(stopped_text(problem.run(plan).diagnosis()).empty());
}

TEST_CASE("a stop before the first round is an error") {
  std::stop_source stop;
  stop.request_stop();
  sy::plan plan{.size = 1000};
  plan.token = stop.get_token();
  std::string const words = "run: a stop was asked for before the first round; nothing was drawn";
  CHECK(said<sy::stopped_early>([&] { problem.run(plan); }) == words);
  CHECK(said<sy::stopped_early>([&] { problem.expectation(plan, law::itself); }) == words);
  CHECK(said<sy::stopped_early>([&] { problem.resample(plan, 5); }) == words);
}

TEST_CASE("a stop ends after the current round, with a finding that says how far it came") {
  std::stop_source stop;
  sy::plan plan{.size = 1'000'000, .seed = 3};
  plan.token = stop.get_token();
  plan.progress = [&](sy::progress_report const&) { stop.request_stop(); };
  auto const sample = problem.run(plan);
  CHECK(sample.drawn() == 1024);
  CHECK(sample.size() == 1024);
  CHECK(stopped_text(sample.diagnosis()) ==
        "The run ended after 1024 of 1000000 samples because a stop was asked for; a run with that size repeats it.");
  CHECK(holds(to_string(sample.diagnosis()), "The run ended after 1024 of 1000000 samples"));
  CHECK(!stopped_text(sample.before().diagnosis()).empty());
}

TEST_CASE("a stop in the last round is no early end") {
  std::stop_source stop;
  sy::plan plan{.size = 1000, .seed = 4};
  plan.token = stop.get_token();
  plan.progress = [&](sy::progress_report const&) { stop.request_stop(); };
  CHECK(stopped_text(problem.run(plan).diagnosis()).empty());
}

TEST_CASE("a time limit ends after the round that reaches it, never before the first") {
  sy::plan plan{.size = 500'000'000, .seed = 5};
  plan.time_limit = std::chrono::nanoseconds(1);
  auto const answers = problem.estimate(plan, sy::expectation(law::itself));
  CHECK(answers.drawn() == 1024);
  CHECK(holds(stopped_text(answers.diagnosis()), "because the time limit was reached"));
  plan.time_limit = std::chrono::milliseconds(30);
  auto const more = problem.estimate(plan, sy::expectation(law::itself));
  CHECK(more.drawn() % 1024 == 0);
  CHECK(more.drawn() < 500'000'000);
  sy::plan const again{.size = more.drawn(), .seed = 5, .threads = 2};
  CHECK((bits(problem.expectation(again, law::itself)) == bits(more.get<0>())));
}

TEST_CASE("an executor that throws, and a progress that throws, end the run with their own words") {
  sy::plan plan{.size = 5000};
  plan.executor = sy::executor([](std::size_t, sy::executor::task const&) { throw std::runtime_error("pool is closed"); });
  CHECK(said<std::runtime_error>([&] { problem.run(plan); }) == "pool is closed");
  CHECK(said<std::runtime_error>([&] { problem.expectation(plan, law::itself); }) == "pool is closed");
  plan.executor = {};
  plan.progress = [](sy::progress_report const&) { throw std::logic_error("window was closed"); };
  CHECK(said<std::logic_error>([&] { problem.run(plan); }) == "window was closed");
}

TEST_CASE("threads call every task once, and hand an exception to the caller") {
  for (unsigned n : {0u, 1u, 2u, 5u}) {
    auto const execute = sy::on_threads(n);
    std::vector<std::atomic<int>> calls(100);
    execute(100, [&](std::size_t i) { ++calls[i]; });
    for (auto const& each : calls) CHECK(each.load() == 1);
    execute(0, [&](std::size_t) { FAIL("no task was given"); });
    CHECK_THROWS_AS(execute(10, [](std::size_t i) { if (i == 3) throw std::runtime_error("task"); }), std::runtime_error);
  }
}
