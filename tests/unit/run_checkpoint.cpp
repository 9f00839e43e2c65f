// SPDX-License-Identifier: BSL-1.0
// Runs that are taken up again, to the same bits.
#include <doctest/doctest.h>

#include <cmath>
#include <cstddef>
#include <memory>
#include <span>
#include <stop_token>
#include <string>
#include <tuple>
#include <vector>

#include <steelyard/core.hpp>

namespace sy = steelyard;

namespace {

auto const prior = [](sy::draws& d) { return d.normal(); };
auto const weighter = [](double x) { return sy::log_likelihood{-2.0 * (1.2 - x) * (1.2 - x)}; };
auto const itself = [](double x) { return x; };

class memory_sink : public sy::checkpoint_sink {
 public:
  void write(std::span<std::byte const> bytes) override { held.assign(bytes.begin(), bytes.end()); }
  std::vector<std::byte> read() override { return held; }
  std::vector<std::byte> held;
};

/// A user's estimator without an error of its own: E exp(f/2).
struct half_exponential {
  decltype(itself) f;
  double weight = 0.0, sum = 0.0;
  auto const& readout() const { return f; }
  half_exponential fresh() const { return {f}; }
  void add(std::span<double const> values, std::span<double const> weights) {
    for (std::size_t i = 0; i < weights.size(); ++i) {
      weight += weights[i];
      sum += weights[i] * std::exp(0.5 * values[i]);
    }
  }
  void rescale(double factor) {
    weight *= factor;
    sum *= factor;
  }
  half_exponential& operator+=(half_exponential const& other) {
    weight += other.weight;
    sum += other.sum;
    return *this;
  }
  double value() const { return sum / weight; }
  template <class Self>
  static auto fields(Self& self) {
    return std::tie(self.weight, self.sum);
  }
};

/// A plan that stops after `rounds` rounds and leaves its state in `sink`.
struct stopping {
  sy::plan plan;
  std::stop_source stop;
  int left;
  stopping(sy::plan base, std::shared_ptr<memory_sink> sink, int rounds) : plan(std::move(base)), left(rounds) {
    plan.checkpoint = std::move(sink);
    plan.token = stop.get_token();
    plan.progress = [this](sy::progress_report const&) {
      if (--left == 0) stop.request_stop();
    };
  }
};

std::string refusal(auto const& act) {
  try {
    act();
  } catch (sy::bad_checkpoint const& e) {
    return e.what();
  }
  return {};
}

}  // namespace

TEST_CASE("a one-pass run taken up again has the bits of a run that was never stopped") {
  sy::pipeline const pipe{prior, weighter};
  sy::plan const plan{.size = 300'001, .seed = 3};
  auto const ask = [&](sy::plan const& how) {
    return pipe.estimate(how, sy::expectation(itself), sy::probability([](double x) { return x > 2.0; }), sy::histogram(itself),
                         sy::log_evidence(), half_exponential{itself});
  };
  auto const whole = ask(plan);
  auto const sink = std::make_shared<memory_sink>();
  stopping first(plan, sink, 4);
  auto const part = ask(first.plan);
  REQUIRE(part.drawn() < 300'001);
  REQUIRE_FALSE(sink->held.empty());
  sy::plan rest = plan;
  rest.checkpoint = sink;
  rest.threads = 2;
  auto const resumed = ask(rest);
  CHECK(resumed.drawn() == 300'001);
  CHECK(resumed.sampler_calls() < 300'001 - part.drawn() + 100);
  CHECK(resumed.get<0>().value == whole.get<0>().value);
  CHECK(resumed.get<0>().standard_error == whole.get<0>().standard_error);
  CHECK(resumed.get<1>().carriers == whole.get<1>().carriers);
  REQUIRE(resumed.get<2>().size() == whole.get<2>().size());
  for (std::size_t b = 0; b < whole.get<2>().size(); ++b)
    CHECK(resumed.get<2>().probability(b).value == whole.get<2>().probability(b).value);
  CHECK(resumed.get<3>().value == whole.get<3>().value);
  CHECK(resumed.get<4>().value == whole.get<4>().value);
  CHECK(resumed.get<4>().standard_error == whole.get<4>().standard_error);
  CHECK(resumed.diagnosis().effective_size() == whole.diagnosis().effective_size());
  // Taken up once more it is over at once.
  CHECK(ask(rest).sampler_calls() < 20);
}

TEST_CASE("a keeping run taken up again has the states and weights of one that was never stopped") {
  auto const fails = [](sy::draws& d) {
    double const x = d.normal();
    return x > 1.9 ? std::optional<double>() : std::optional<double>(x);
  };
  sy::pipeline const pipe{fails, weighter};
  for (sy::keeping const keep : {sy::keeping::states, sy::keeping::streams}) {
    sy::plan const plan{.size = 60'000, .seed = 4, .keep = keep, .on_failure = sy::failures::set_aside};
    auto const whole = pipe.run(plan);
    auto const sink = std::make_shared<memory_sink>();
    stopping first(plan, sink, 3);
    auto const part = pipe.run(first.plan);
    REQUIRE(part.drawn() < 60'000);
    sy::plan rest = plan;
    rest.checkpoint = sink;
    auto const resumed = pipe.run(rest);
    REQUIRE(resumed.size() == whole.size());
    CHECK(resumed.diagnosis().failed() == whole.diagnosis().failed());
    CHECK(resumed.sample_index(resumed.size() - 1) == whole.sample_index(whole.size() - 1));
    CHECK(resumed.expectation(itself).value == whole.expectation(itself).value);
    CHECK(resumed.log_evidence().standard_error == whole.log_evidence().standard_error);
    CHECK(resumed.state(5'000) == whole.state(5'000));
  }
}

TEST_CASE("a checkpoint of another seed, size, question, kind or version, cut short or damaged, is refused in words") {
  sy::pipeline const pipe{prior, weighter};
  auto const sink = std::make_shared<memory_sink>();
  sy::plan plan{.size = 50'000, .seed = 3};
  plan.checkpoint = sink;
  (void)pipe.estimate(plan, sy::expectation(itself));
  std::vector<std::byte> const good = sink->held;
  auto const take_up = [&](sy::plan const& how) { (void)pipe.estimate(how, sy::expectation(itself)); };

  sy::plan other = plan;
  other.seed = 4;
  CHECK(refusal([&] { take_up(other); }).find("its seed is 3 and this run's is 4") != std::string::npos);
  other = plan;
  other.size = 60'000;
  CHECK(refusal([&] { take_up(other); }).find("its size is 50000 and this run's is 60000") != std::string::npos);
  other = plan;
  other.on_failure = sy::failures::set_aside;
  CHECK(refusal([&] { take_up(other); }).find("treatment of failures") != std::string::npos);
  CHECK(refusal([&] { (void)pipe.estimate(plan, sy::histogram(itself, sy::equal_bins(-1, 1, 4))); })
            .find("other questions or readings") != std::string::npos);
  CHECK(refusal([&] { (void)pipe.run(plan); }).find("kind of run") != std::string::npos);

  sink->held = good;
  sink->held.resize(good.size() / 2);
  CHECK(refusal([&] { take_up(plan); }).find("cut short or damaged") != std::string::npos);
  sink->held = good;
  sink->held[good.size() / 2] ^= std::byte{1};
  CHECK(refusal([&] { take_up(plan); }).find("cut short or damaged") != std::string::npos);
  sink->held = good;
  sink->held[8] = std::byte{99};
  CHECK(refusal([&] { take_up(plan); }).find("format version") != std::string::npos);
  sink->held.assign(40, std::byte{7});
  CHECK(refusal([&] { take_up(plan); }).find("none of ours") != std::string::npos);
  CHECK(sink->held.size() == 40);  // nothing was overwritten
  sink->held = good;
  CHECK(refusal([&] { take_up(plan); }).empty());
}

TEST_CASE("states that are no bytes are not written, and the sentence says what to do") {
  auto const text = [](sy::draws& d) { return std::string(d.chance(0.5) ? "a" : "b"); };
  auto const even = [](std::string const&) { return sy::likelihood{1.0}; };
  sy::plan plan{.size = 2'000};
  plan.checkpoint = std::make_shared<memory_sink>();
  CHECK_THROWS_WITH_AS((void)sy::pipeline(text, even).run(plan), doctest::Contains("keeping::streams"), sy::bad_argument);
  plan.keep = sy::keeping::streams;
  CHECK(sy::pipeline(text, even).run(plan).size() == 2'000);
}
