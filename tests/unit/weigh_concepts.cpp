// SPDX-License-Identifier: BSL-1.0
// What may be a sampler, a weighter, a readout and an event, and what may not:
// each concept with its list of both.

#include <doctest/doctest.h>

#include <array>
#include <cstddef>
#include <functional>
#include <memory>
#include <optional>
#include <span>
#include <string>
#include <string_view>
#include <vector>

#include <steelyard/core.hpp>

namespace sy = steelyard;

namespace concept_lists {

struct tank {
  double level = 0.0;
  int valves = 0;
  bool leaking = false;
  std::string label;
  double volume() const { return 2.0 * level; }
  bool full() const { return level > 1.0; }
};

struct huge_state {  // movable, neither copyable nor default-constructible
  explicit huge_state(std::size_t n) : cells(std::make_unique<double[]>(n)) {}
  std::unique_ptr<double[]> cells;
};
struct fixed_in_place {
  fixed_in_place() = default;
  fixed_in_place(fixed_in_place&&) = delete;
};

inline double plain_sampler(sy::draws& draws) { return draws.uniform(); }

// --- samplers
inline auto lambda = [](sy::draws& draws) { return draws.normal(); };
inline auto of_tank = [](sy::draws& draws) { return tank{draws.uniform(), 1, false, ""}; };
inline auto of_huge = [](sy::draws&) { return huge_state(3); };
inline auto may_fail = [](sy::draws& draws) -> std::optional<tank> {
  if (draws.chance(0.5)) return std::nullopt;
  return tank{};
};
inline auto generic = [](auto& source) { return source.uniform(); };
inline auto of_array = [](sy::draws& draws) { return std::array{draws.uniform(), draws.uniform()}; };
inline auto per_worker = sy::per_worker([] { return [n = 0](sy::draws& draws) mutable { return ++n * draws.uniform(); }; });
struct solver {
  tank operator()(sy::draws&) const { return {}; }
};

inline auto returns_nothing = [](sy::draws&) {};
inline auto changes_itself = [n = 0](sy::draws& draws) mutable { return ++n * draws.uniform(); };
inline auto takes_nothing = [] { return 1.0; };
inline auto takes_a_copy = [](sy::draws draws) { return draws.uniform(); };
inline auto takes_an_engine = [](std::size_t& engine) { return static_cast<double>(engine); };
inline auto takes_two = [](sy::draws& draws, int) { return draws.uniform(); };

static_assert(sy::sampler<decltype(lambda)>);
static_assert(sy::sampler<decltype(of_tank)>);
static_assert(sy::sampler<decltype(of_huge)>);
static_assert(sy::sampler<decltype(may_fail)>);
static_assert(sy::sampler<decltype(generic)>);
static_assert(sy::sampler<decltype(of_array)>);
static_assert(sy::sampler<decltype(per_worker)>);
static_assert(sy::sampler<solver>);
static_assert(sy::sampler<tank const& (*)(sy::draws&)>);
static_assert(sy::sampler<std::optional<huge_state> (*)(sy::draws&)>);
static_assert(sy::sampler<decltype(&plain_sampler)>);
static_assert(sy::sampler<std::function<double(sy::draws&)>>);
static_assert(std::is_same_v<sy::state_of_t<decltype(may_fail)>, tank>);
static_assert(std::is_same_v<sy::state_of_t<decltype(of_huge)>, huge_state>);

static_assert(!sy::sampler<decltype(returns_nothing)>);
static_assert(!sy::sampler<decltype(changes_itself)>);
static_assert(!sy::sampler<decltype(takes_nothing)>);
static_assert(!sy::sampler<decltype(takes_a_copy)>);
static_assert(!sy::sampler<decltype(takes_an_engine)>);
static_assert(!sy::sampler<decltype(takes_two)>);
static_assert(!sy::sampler<double>);
static_assert(!sy::sampler<huge_state& (*)(sy::draws&)>);
static_assert(!sy::sampler<fixed_in_place (*)(sy::draws&)>);

// --- weighters
inline auto as_log = [](tank const& t) { return sy::log_likelihood{-t.level}; };
inline auto as_plain = [](tank const& t) { return sy::likelihood{t.level}; };
inline auto by_value = [](tank t) { return sy::likelihood{t.level}; };
inline auto both_readings = sy::together(sy::named("gauge", as_log), sy::named("meter", as_plain));
inline auto said_aloud = sy::as_likelihood(&tank::level);
inline auto said_as_log = sy::as_log_likelihood(&tank::volume);
inline auto with_bound = sy::bounded(as_plain, 0.0);
inline auto scratch = sy::per_worker([] { return [n = 0](tank const&) mutable { return sy::likelihood{1.0 + 0.0 * ++n}; }; });
struct two_items {
  static constexpr std::size_t size = 2;
  std::string_view name(std::size_t i) const { return i == 0 ? "first" : "second"; }
  void scores(tank const& t, std::span<double> out) const { out[0] = out[1] = -t.level; }
};

inline auto bare = [](tank const& t) { return -t.level; };
inline auto whole_number = [](tank const&) { return 1; };
inline auto truth_value = [](tank const& t) { return t.leaking; };
inline auto no_answer = [](tank const&) {};
inline auto of_something_else = [](std::string const&) { return sy::likelihood{1.0}; };
inline auto counts_calls = [n = 0](tank const&) mutable { return sy::likelihood{1.0 + 0.0 * ++n}; };
inline auto wants_to_change = [](tank& t) { return sy::likelihood{t.level}; };
struct no_items : two_items {
  static constexpr std::size_t size = 0;
};

static_assert(sy::weighter_for<decltype(as_log), tank>);
static_assert(sy::weighter_for<decltype(as_plain), tank>);
static_assert(sy::weighter_for<decltype(by_value), tank>);
static_assert(sy::weighter_for<decltype(both_readings), tank>);
static_assert(sy::weighter_for<decltype(said_aloud), tank>);
static_assert(sy::weighter_for<decltype(said_as_log), tank>);
static_assert(sy::weighter_for<decltype(with_bound), tank>);
static_assert(sy::weighter_for<decltype(scratch), tank>);
static_assert(sy::weighter_for<two_items, tank>);
static_assert(sy::weighter_for<std::function<sy::likelihood(tank const&)>, tank>);
static_assert(sy::itemised_weighter_for<two_items, tank>);
static_assert(sy::itemised_weighter_for<decltype(both_readings), tank>);

static_assert(!sy::weighter_for<decltype(bare), tank>);
static_assert(!sy::weighter_for<decltype(whole_number), tank>);
static_assert(!sy::weighter_for<decltype(truth_value), tank>);
static_assert(!sy::weighter_for<decltype(no_answer), tank>);
static_assert(!sy::weighter_for<decltype(of_something_else), tank>);
static_assert(!sy::weighter_for<decltype(counts_calls), tank>);
static_assert(!sy::weighter_for<decltype(wants_to_change), tank>);
static_assert(!sy::weighter_for<no_items, tank>);
static_assert(!sy::weighter_for<two_items, std::string>);
static_assert(!sy::weighter_for<decltype(both_readings), std::string>);
static_assert(!sy::itemised_weighter_for<decltype(as_log), tank>);
static_assert(!sy::weighter_for<double, tank>);

// --- readouts
inline auto level = [](tank const& t) { return t.level; };
inline auto level_and_volume = [](tank const& t) { return std::array{t.level, t.volume()}; };
inline auto named_level = sy::readout{"level", "m", &tank::level};
inline auto of_label = [](tank const& t) { return t.label; };
inline auto several = [](tank const& t) { return std::vector{t.level}; };
inline auto nothing = [](tank const&) {};
inline auto pointer = [](tank const& t) { return &t.level; };
inline auto texts = [](tank const& t) { return std::array{t.label}; };

static_assert(sy::readout_for<decltype(level), tank>);
static_assert(sy::readout_for<decltype(level_and_volume), tank>);
static_assert(sy::readout_for<decltype(named_level), tank>);
static_assert(sy::readout_for<decltype(&tank::level), tank>);
static_assert(sy::readout_for<decltype(&tank::valves), tank>);
static_assert(sy::readout_for<decltype(&tank::volume), tank>);
static_assert(sy::readout_for<decltype(&tank::full), tank>);
static_assert(sy::readout_for<float (*)(tank), tank>);
static_assert(sy::readout_columns<std::array<float, 3>>::size == 3);
static_assert(sy::readout_columns<bool>::size == 1);

static_assert(!sy::readout_for<decltype(of_label), tank>);
static_assert(!sy::readout_for<decltype(several), tank>);
static_assert(!sy::readout_for<decltype(nothing), tank>);
static_assert(!sy::readout_for<decltype(pointer), tank>);
static_assert(!sy::readout_for<decltype(texts), tank>);
static_assert(!sy::readout_for<decltype(level), std::string>);
static_assert(!sy::readout_for<decltype(&tank::level), double>);
static_assert(!sy::readout_for<decltype(as_log), tank>);
static_assert(!sy::readout_for<std::array<double, 0> (*)(tank const&), tank>);

// --- events
inline auto high = [](tank const& t) { return t.level > 3.0; };
inline auto counted = [](tank const& t) { return t.valves; };
inline auto share = [](tank const& t) { return t.level > 3.0 ? 1.0 : 0.0; };
inline auto two_events = [](tank const& t) { return std::array{t.leaking, t.full()}; };

static_assert(sy::event_for<decltype(high), tank>);
static_assert(sy::event_for<decltype(&tank::leaking), tank>);
static_assert(sy::event_for<decltype(&tank::full), tank>);
static_assert(sy::event_for<decltype(sy::readout{"leaks", "", &tank::leaking}), tank>);

static_assert(!sy::event_for<decltype(counted), tank>);
static_assert(!sy::event_for<decltype(share), tank>);
static_assert(!sy::event_for<decltype(two_events), tank>);
static_assert(!sy::event_for<decltype(high), double>);
static_assert(!sy::event_for<decltype(&tank::level), tank>);

// --- draws: one source, handed on by reference
static_assert(!std::is_copy_constructible_v<sy::draws>);
static_assert(!std::is_move_constructible_v<sy::draws>);

// --- log_likelihood and likelihood are never made of a number by accident
static_assert(!std::is_convertible_v<double, sy::log_likelihood>);
static_assert(!std::is_convertible_v<double, sy::likelihood>);
static_assert(!std::is_convertible_v<sy::log_likelihood, sy::likelihood>);
static_assert(!std::is_convertible_v<sy::log_likelihood, double>);

}  // namespace concept_lists

using namespace concept_lists;

TEST_CASE("whatever is on a yes-list runs") {
  sy::plan const plan{.size = 64};
  auto const any_tank = [](auto const&) { return sy::likelihood{1.0}; };
  CHECK(sy::pipeline{lambda, any_tank}.run(plan).size() == 64);
  CHECK(sy::pipeline{generic, any_tank}.run(plan).size() == 64);
  CHECK(sy::pipeline{of_array, any_tank}.run(plan).size() == 64);
  CHECK(sy::pipeline{of_huge, any_tank}.run(plan).size() == 64);
  CHECK(sy::pipeline{solver{}, as_log}.run(plan).size() == 64);
  CHECK(sy::pipeline{std::function<double(sy::draws&)>(&plain_sampler), any_tank}.run(plan).size() == 64);
  auto const keeps_going = sy::pipeline{may_fail, any_tank}.run({.size = 64, .on_failure = sy::failures::set_aside});
  CHECK(keeps_going.size() + keeps_going.diagnosis().failed() == 64);

  sy::pipeline const tanks{of_tank, any_tank};
  CHECK(tanks.run(plan).reweigh(as_log).size() == 64);
  CHECK(tanks.run(plan).reweigh(by_value).size() == 64);
  CHECK(tanks.run(plan).reweigh(both_readings).names().size() == 2);
  CHECK(tanks.run(plan).reweigh(two_items{}).names()[1] == "second");
  CHECK(tanks.run(plan).reweigh(said_aloud).names()[0] == "likelihood");
  CHECK(tanks.run(plan).reweigh(said_as_log).size() == 64);
  CHECK(tanks.run(plan).reweigh(with_bound).size() == 64);
  CHECK(tanks.run(plan).reweigh(scratch).size() == 64);
  CHECK(tanks.run(plan).expectation(&tank::valves).value == 1.0);
  CHECK(tanks.run(plan).expectation(level_and_volume)[1].value == 2.0 * tanks.run(plan).expectation(level).value);
  CHECK(tanks.run(plan).probability(sy::readout{"leaks", "", &tank::leaking}).never_seen());
}
