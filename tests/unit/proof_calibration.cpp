// SPDX-License-Identifier: BSL-1.0
// legs: plain
#include <doctest/doctest.h>

#include <steelyard/draw/draws.hpp>
#include <steelyard/proof/calibration.hpp>
#include <steelyard/run/threads.hpp>

#include <cmath>
#include <cstddef>
#include <cstdint>
#include <optional>
#include <stdexcept>
#include <string>
#include <utility>
#include <vector>

namespace sy = steelyard;
using sy::proof::calibration;
using sy::proof::outcome;

namespace {

bool says(sy::proof::check const& c, char const* words) { return c.sentence().find(words) != std::string::npos; }

auto const prior = [](sy::draws& d) { return d.normal(); };
auto const itself = [](double x) { return x; };
auto read_with(double sd) {
  return [sd](double truth, sy::draws& d) { return truth + sd * d.normal(); };
}
auto weighed_with(double sd, double shift = 0.0) {
  return [=](double y) {
    return [=](double x) { return sy::log_likelihood{-0.5 * std::pow((y - shift - x) / sd, 2)}; };
  };
}

}  // namespace

TEST_CASE("the position of a truth in its pool") {
  // below: weights 1 + 2; tied: 4, with the truth's own 8; above: 16. V = 1/4: (3 + 3) / 31.
  std::vector<double> const values{0.0, 1.0, 2.0, 3.0};
  std::vector<double> logs;
  for (double const w : {1.0, 2.0, 4.0, 16.0}) logs.push_back(std::log(w));
  auto const position = [&](double v, double shift = 0.0) {
    std::vector<double> moved = logs;
    for (double& each : moved) each += shift;
    return sy::proof::detail::pool_position(moved, values, std::log(8.0) + shift, 2.0, v);
  };
  CHECK(position(0.25) == doctest::Approx(6.0 / 31.0).epsilon(1e-14));
  CHECK(position(0.75) == doctest::Approx(12.0 / 31.0).epsilon(1e-14));
  CHECK(position(0.25, 5'000.0) == doctest::Approx(6.0 / 31.0).epsilon(1e-12));
  CHECK(sy::proof::detail::pool_position({}, {}, -3.0, 1.0, 0.125) == 0.125);  // alone in its pool
}

TEST_CASE("an honest model passes at every size, however small") {
  for (unsigned const size : {1u, 10u, 100u}) {
    INFO("size ", size);
    CHECK(calibration(prior, read_with(0.5), weighed_with(0.5), itself, {.repeats = 2'000, .size = size}));
  }
}

TEST_CASE("a model too narrow, too wide or shifted fails, and which way is said") {
  auto const narrow = calibration(prior, read_with(0.5), weighed_with(0.3), itself, {.repeats = 2'000});
  CHECK(narrow.result() == outcome::failed);
  CHECK(says(narrow, "too narrow"));
  auto const wide = calibration(prior, read_with(0.5), weighed_with(0.9), itself, {.repeats = 2'000});
  CHECK(wide.result() == outcome::failed);
  CHECK(says(wide, "too wide"));
  auto const low = calibration(prior, read_with(0.5), weighed_with(0.5, 0.3), itself, {.repeats = 2'000});
  CHECK(says(low, "shifted: it lies below the truth"));
  auto const high = calibration(prior, read_with(0.5), weighed_with(0.5, -0.3), itself, {.repeats = 2'000});
  CHECK(says(high, "shifted: it lies above the truth"));
  // a weighter that is the same for every reading ignores it: the prior is too wide a posterior
  CHECK(calibration(prior, read_with(0.5), [](double) { return [](double) { return sy::likelihood{1.0}; }; }, itself));
}

TEST_CASE("a likelihood taken for its square root is found") {
  auto const halved = [](double y) {
    return [y](double x) { return sy::log_likelihood{-std::pow((y - x) / 0.5, 2)}; };
  };
  CHECK_FALSE(calibration(prior, read_with(0.5), halved, itself, {.repeats = 2'000}));
}

TEST_CASE("the readings that fare worst are named") {
  // right below zero, too narrow above
  auto const uneven = [](double y) {
    double const sd = y > 0.0 ? 0.25 : 0.5;
    return [=](double x) { return sy::log_likelihood{-0.5 * std::pow((y - x) / sd, 2)}; };
  };
  auto const found = calibration(prior, read_with(0.5), uneven, itself, {.repeats = 4'000});
  CHECK(found.result() == outcome::failed);
  auto const at = found.sentence().find("worst for readings from ");
  REQUIRE(at != std::string::npos);
  CHECK(std::stod(found.sentence().substr(at + 24)) > -0.3);  // the first of a fifth of the readings
  auto const lists = [&](double truth, sy::draws& d) { return std::vector<double>{truth + 0.5 * d.normal()}; };
  auto const by_list = [](std::vector<double> const& y) { return weighed_with(0.2)(y[0]); };
  CHECK(says(calibration(prior, lists, by_list, itself, {.repeats = 2'000}), "worst in repeats "));
}

TEST_CASE("ties: events, whole numbers and constants") {
  auto const event = [](double x) { return x > 0.3; };
  CHECK(calibration(prior, read_with(0.5), weighed_with(0.5), event, {.repeats = 2'000}));
  CHECK_FALSE(calibration(prior, read_with(0.5), weighed_with(0.5, 0.5), event, {.repeats = 2'000}));
  auto const whole = [](sy::draws& d) { return static_cast<int>(d.index(6)); };
  auto const grade = [](int truth, sy::draws& d) { return d.chance(0.7) ? truth : static_cast<int>(d.index(6)); };
  auto const weigh = [](double hit) {
    return [hit](int y) {
      return [=](int x) { return sy::likelihood{x == y ? hit + (1.0 - hit) / 6.0 : (1.0 - hit) / 6.0}; };
    };
  };
  auto const number = [](int x) { return x; };
  CHECK(calibration(whole, grade, weigh(0.7), number, {.repeats = 2'000, .size = 20}));
  CHECK_FALSE(calibration(whole, grade, weigh(0.3), number, {.repeats = 2'000, .size = 20}));
  CHECK(calibration(prior, read_with(0.5), weighed_with(0.5), [](double) { return 7; }));
}

TEST_CASE("a prior that may return no state") {
  auto const half = [](sy::draws& d) {
    double const x = d.normal();
    return x > 0.0 ? std::optional<double>(x) : std::nullopt;
  };
  CHECK(calibration(half, read_with(0.5), weighed_with(0.5), itself, {.repeats = 2'000}));
  CHECK_FALSE(calibration(half, read_with(0.5), weighed_with(0.25), itself, {.repeats = 2'000}));
  auto const never = [](sy::draws&) { return std::optional<double>(); };
  CHECK_THROWS_AS(calibration(never, read_with(0.5), weighed_with(0.5), itself), sy::failed_sample);
}

TEST_CASE("a truth that its own weighter calls impossible") {
  auto const strict = [](double y) {
    return [y](double x) { return sy::likelihood{std::abs(y - x) < 1.0 ? 1.0 : 0.0}; };
  };
  auto const found = calibration(prior, read_with(0.5), strict, itself);
  CHECK(found.result() == outcome::failed);
  CHECK(says(found, "impossible"));
}

TEST_CASE("the same check whatever the threads, within a budget of sampler calls, with progress") {
  auto const once = calibration(prior, read_with(0.5), weighed_with(0.5), itself, {.repeats = 300, .size = 50});
  std::uint64_t last = 0;
  auto const again = calibration(prior, read_with(0.5), weighed_with(0.5), itself,
                                 {.repeats = 300,
                                  .size = 50,
                                  .executor = sy::on_threads(2),
                                  .progress = [&](std::uint64_t done, std::uint64_t all) {
                                    CHECK(done > last);
                                    CHECK(all == 300u);
                                    last = done;
                                  }});
  CHECK(last == 300u);
  CHECK(once.sentence() == again.sentence());
  CHECK(std::vector<double>(once.positions().begin(), once.positions().end()) ==
        std::vector<double>(again.positions().begin(), again.positions().end()));
  CHECK(once.sampler_calls() == 300u * 51u);
  auto const cheap =
      calibration(prior, read_with(0.5), weighed_with(0.5), itself, {.repeats = 10'000, .size = 50, .budget = 10'250});
  CHECK(cheap.positions().size() == 200u);
  CHECK(cheap.sampler_calls() <= 10'250u);
}

TEST_CASE("bad input to calibration, and failures inside it") {
  CHECK_THROWS_AS(calibration(prior, read_with(0.5), weighed_with(0.5), itself, {.repeats = 99}), sy::bad_argument);
  CHECK_THROWS_AS(calibration(prior, read_with(0.5), weighed_with(0.5), itself, {.size = 0}), sy::bad_argument);
  CHECK_THROWS_AS(calibration(prior, read_with(0.5), weighed_with(0.5), itself, {.false_alarm = 1.0}),
                  sy::bad_argument);
  CHECK_THROWS_AS(calibration(prior, read_with(0.5), weighed_with(0.5), itself, {.bins = 1}), sy::bad_argument);
  CHECK_THROWS_AS(calibration(prior, read_with(0.5), weighed_with(0.5), itself, {.budget = 1'000}), sy::bad_argument);
  auto const negative = [](double y) { return [y](double x) { return sy::likelihood{y - x}; }; };
  CHECK_THROWS_AS(calibration(prior, read_with(0.5), negative, itself), sy::failed_sample);
  auto const root = [](double x) { return std::sqrt(x); };
  CHECK_THROWS_AS(calibration(prior, read_with(0.5), weighed_with(0.5), root), sy::failed_sample);
  auto const throwing = [](double truth, sy::draws& d) {
    if (truth > 2.5) throw std::runtime_error("the scale is full");
    return truth + 0.5 * d.normal();
  };
  std::string said;
  try {
    calibration(prior, throwing, weighed_with(0.5), itself, {.executor = sy::on_threads(2)});
  } catch (sy::failed_sample const& e) {
    said = e.what();
    CHECK_THROWS_AS(std::rethrow_if_nested(e), std::runtime_error);
  }
  CHECK(said.find("failed: the scale is full") != std::string::npos);
}
