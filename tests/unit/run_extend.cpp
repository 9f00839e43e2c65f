// SPDX-License-Identifier: BSL-1.0
// A sample extended is a longer run, bit for bit, wherever the first run ended and
// whatever was kept of it.

#include <doctest/doctest.h>

#include <cstdint>
#include <memory>
#include <optional>
#include <stop_token>
#include <string>
#include <utility>
#include <vector>

#include <steelyard/core.hpp>

#include "law_questions.hpp"

namespace sy = steelyard;
using law::bits;
using law::holds;
using law::said;

namespace {

struct huge_state {
  explicit huge_state(double x) : cells(std::make_unique<double[]>(3)) { cells[0] = x; }
  std::unique_ptr<double[]> cells;
};
huge_state draw_huge(sy::draws& draws) { return huge_state(draws.normal()); }
sy::log_likelihood read_huge(huge_state const& s) { return law::read_one(s.cells[0]); }
double first_cell(huge_state const& s) { return s.cells[0]; }

std::optional<double> may_fail(sy::draws& draws) {
  double const x = draws.normal();
  if (draws.chance(0.1)) return std::nullopt;
  return x;
}
struct step {
  std::uint64_t from, more;
};
/// Part blocks, whole blocks, less than one, and from one stretch of blocks into the next.
std::vector<step> const steps{{1, 1}, {10, 5}, {1000, 24}, {1000, 25}, {1024, 1}, {1024, 5000}, {1500, 3000}, {5000, 1}, {16'000, 5000}};

}  // namespace

TEST_CASE("a sample extended answers with the bits of the longer run") {
  sy::pipeline const problem{law::draw_normal, law::read_one};
  for (step const& one : steps)
    for (sy::keeping const keep : {sy::keeping::states, sy::keeping::streams}) {
      std::uint64_t const from = one.from, more = one.more;
      CAPTURE(from);
      CAPTURE(more);
      sy::plan plan{.size = from, .seed = 1, .keep = keep};
      auto const longer = problem.extend(problem.run(plan), more);
      plan.size = from + more;
      auto const direct = problem.run(plan);
      CHECK(longer.size() == from + more);
      CHECK(longer.drawn() == from + more);
      CHECK((bits(law::ask_everything(longer)) == bits(law::ask_everything(direct))));
      CHECK(longer.state(from) == direct.state(from));
      CHECK(longer.sample_index(from) == from);
    }
}

TEST_CASE("extending with runs set aside, and with several readings") {
  auto const both = sy::together(sy::named("first", law::read_one), sy::named("second", [](double x) { return sy::likelihood{x < 1.0 ? 1.0 : 0.0}; }));
  sy::pipeline const failing{may_fail, both};
  for (step const& one : steps) {
    std::uint64_t const from = one.from, more = one.more;
    if (from < 10) continue;
    CAPTURE(from);
    sy::plan plan{.size = from, .seed = 2, .on_failure = sy::failures::set_aside};
    auto const longer = failing.extend(failing.run(plan), more);
    plan.size = from + more;
    auto const direct = failing.run(plan);
    CHECK(longer.size() == direct.size());
    CHECK(longer.diagnosis().failed() == direct.diagnosis().failed());
    CHECK(longer.sample_index(longer.size() - 1) == direct.sample_index(direct.size() - 1));
    CHECK((bits(law::ask_everything(longer)) == bits(law::ask_everything(direct))));
    CHECK((bits(longer.without("second").expectation(law::itself)) == bits(direct.without("second").expectation(law::itself))));
  }
}

TEST_CASE("states that cannot be copied: moved when nobody else holds them, made again when somebody does") {
  sy::pipeline const problem{&draw_huge, &read_huge};
  auto const direct = problem.run({.size = 3500, .seed = 3});
  auto sample = problem.run({.size = 2000, .seed = 3});
  double const* const cell = sample.states()[77].cells.get();

  auto const shared = problem.extend(sample, 1500);
  CHECK(shared.states()[77].cells.get() != cell);
  CHECK(sample.states()[77].cells.get() == cell);  // the sample is as it was
  CHECK(sample.size() == 2000);
  CHECK(sample.expectation(&first_cell).effective_size > 100.0);
  CHECK((bits(shared.expectation(&first_cell)) == bits(direct.expectation(&first_cell))));
  CHECK(shared.sampler_calls() >= 2000 + 1500 + 2000);  // the first 2000 were made again

  auto const alone = problem.extend(std::move(sample), 1500);
  CHECK(alone.states()[77].cells.get() == cell);
  CHECK((bits(alone.expectation(&first_cell)) == bits(direct.expectation(&first_cell))));
}

TEST_CASE("a copy that is still looked at is never emptied, whoever holds it") {
  sy::pipeline const problem{law::draw_normal, law::read_one};
  auto sample = problem.run({.size = 2000, .seed = 4});
  auto const prior = sample.before();
  auto const chosen = sample.resample(10, {.seed = 1});
  double const first = chosen[0];
  auto const longer = problem.extend(std::move(sample), 500);
  CHECK(prior.states().size() == 2000);
  CHECK(prior.state(5) == longer.state(5));
  CHECK(chosen[0] == first);
  CHECK(longer.states().data() != prior.states().data());
}

TEST_CASE("extending keeps the run's threads and executor, and goes on after a stop") {
  sy::pipeline const problem{law::draw_normal, law::read_one};
  std::stop_source stop;
  sy::plan plan{.size = 100'000, .seed = 5, .threads = 2};
  plan.token = stop.get_token();
  plan.progress = [&](sy::progress_report const& report) {
    if (report.drawn >= 3000) stop.request_stop();
  };
  auto stopped = problem.run(plan);
  std::uint64_t const drawn = stopped.drawn();
  CHECK(drawn < 100'000);
  bool found = false;
  for (sy::finding const& each : stopped.diagnosis().findings()) found = found || each.kind == sy::finding_kind::stopped;
  CHECK(found);
  auto const whole = problem.extend(std::move(stopped), 100'000 - drawn);
  for (sy::finding const& each : whole.diagnosis().findings()) CHECK(each.kind != sy::finding_kind::stopped);
  CHECK((bits(law::ask_everything(whole)) == bits(law::ask_everything(problem.run({.size = 100'000, .seed = 5})))));
}

TEST_CASE("extending in many steps is one long run") {
  sy::pipeline const problem{law::draw_normal, law::read_one};
  auto sample = problem.run({.size = 100, .seed = 6});
  for (std::uint64_t const more : {1u, 2u, 900u, 21u, 1000u, 5000u}) sample = problem.extend(std::move(sample), more);
  CHECK((bits(law::ask_everything(sample)) == bits(law::ask_everything(problem.run({.size = 7024, .seed = 6})))));
  CHECK((bits(problem.extend(sample, 0).expectation(law::itself)) == bits(sample.expectation(law::itself))));
}

TEST_CASE("calls of the sampler add up over extensions and looks") {
  sy::pipeline const problem{law::draw_normal, law::read_one};
  auto const sample = problem.run({.size = 1000, .seed = 7, .keep = sy::keeping::streams});
  sample.expectation(law::itself);
  std::uint64_t const before = sample.sampler_calls();
  CHECK(before >= 2000);
  auto const longer = problem.extend(sample, 100);
  CHECK(longer.sampler_calls() >= before + 1100);       // the part block is drawn again
  CHECK(longer.sampler_calls() <= before + 1100 + 16);  // and a few samples are checked
  CHECK(sample.sampler_calls() == before);
}

TEST_CASE("what cannot be extended is refused, and stays as it was") {
  sy::pipeline const problem{law::draw_normal, law::read_one};
  auto const sample = problem.run({.size = 1000, .seed = 8});
  auto const before = bits(sample.expectation(law::itself));
  std::string const other = "extend: this sample was weighed by another weighter than this pipeline's; extend it before reweighing";
  CHECK(said<sy::bad_argument>([&] { problem.extend(sample.given([](double x) { return x > 0.0; }), 10); }) == other);
  CHECK(said<sy::bad_argument>([&] { problem.extend(sample.before(), 10); }) == other);
  CHECK(said<sy::bad_argument>([&] { problem.extend(sample.reweigh(sy::named("gauge", law::read_one)), 10); }) == other);
  // Another weighter without a name, another sampler, another pipeline: the samples themselves tell.
  std::string const differs = "comes out differently under this pipeline; extend a sample with the pipeline that drew it";
  auto const half = [](double x) { return sy::likelihood{1.0 + x * x}; };
  auto const draw_uniform = [](sy::draws& draws) { return draws.uniform(); };
  CHECK(holds(said<sy::bad_argument>([&] { problem.extend(sample.reweigh(half), 10); }), differs));
  sy::pipeline const other_sampler{draw_uniform, law::read_one};
  CHECK(holds(said<sy::bad_argument>([&] { other_sampler.extend(sample, 10); }), differs));
  std::vector<double> const states{1.0, 2.0};
  std::string const given = "extend: this sample was not drawn by a pipeline; weigh the longer ensemble instead";
  CHECK(said<sy::bad_argument>([&] { problem.extend(sy::weigh(states, law::read_one, {.groups = {1, 2}}), 10); }) == given);
  CHECK(said<sy::bad_argument>([&] { problem.extend(sy::weigh(states, law::read_one, {.counts = {1, 2}}), 10); }) == given);
  CHECK(said<sy::bad_argument>([&] { problem.extend(sy::weigh(states, law::read_one), 10); }) == given);
  CHECK(said<sy::bad_argument>([&] { problem.extend(sample, -1); }) == "count: -1 is negative; a count is zero or more");
  CHECK((bits(sample.expectation(law::itself)) == before));
}
