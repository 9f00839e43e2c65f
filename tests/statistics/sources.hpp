// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <steelyard/core.hpp>

#include <algorithm>
#include <cmath>
#include <cstddef>
#include <cstdint>
#include <functional>
#include <map>
#include <optional>
#include <type_traits>
#include <utility>
#include <vector>

#include "statistics/exact.hpp"

// How the samples of a problem come about, through the public interface alone.

namespace known {

namespace sy = steelyard;

/// A state: x is what is asked about, y what else a weighter may need.
struct point {
  double x = 0.0;
  double y = 0.0;
};

struct source {
  std::function<sy::weighted_sample<point>(std::uint64_t seed, std::size_t size)> sample;
  /// k states in one pass; empty where no pipeline draws them, or one whose runs may fail.
  std::function<sy::ensemble<point>(std::uint64_t seed, std::size_t size, std::size_t k)> one_pass = {};
};

// Functions are held behind one type each, so that a table of many problems costs the compiler a few pipelines.
using sampler_of_points = std::function<point(sy::draws&)>;
using weighter_of_points = std::function<sy::log_likelihood(point const&)>;

template <class State, class Score>
source piped_as(std::function<State(sy::draws&)> sampler, std::function<Score(point const&)> weighter) {
  auto const how = [](std::uint64_t seed, std::size_t size) {
    return sy::plan{.size = size, .seed = seed, .on_failure = sy::failures::set_aside};
  };
  sy::pipeline pipe{std::move(sampler), std::move(weighter)};
  source from{[=](std::uint64_t seed, std::size_t size) { return pipe.run(how(seed, size)); }};
  if constexpr (std::is_same_v<State, point> && std::is_same_v<Score, sy::log_likelihood>)
    from.one_pass = [=](std::uint64_t seed, std::size_t size, std::size_t k) { return pipe.resample(how(seed, size), k); };
  return from;
}
template <class Sampler, class Weighter>
source piped(Sampler sampler, Weighter weighter) {
  return piped_as(std::function<std::invoke_result_t<Sampler&, sy::draws&>(sy::draws&)>(std::move(sampler)),
                  std::function<std::invoke_result_t<Weighter&, point const&>(point const&)>(std::move(weighter)));
}

/// A sample that is drawn and then changed: reweighed, restricted, ...
inline source changed(source from, std::function<sy::weighted_sample<point>(sy::weighted_sample<point> const&)> change) {
  return {[=](std::uint64_t seed, std::size_t size) { return change(from.sample(seed, size)); }};
}

/// An ensemble made elsewhere: `state(seed, i)`, and options that `describe(i, state, options)` fills.
inline source weighed(std::function<point(std::uint64_t seed, std::size_t i)> state,
                      std::function<void(std::size_t i, point const&, sy::weigh_options&)> describe,
                      weighter_of_points weighter) {
  return {[=](std::uint64_t seed, std::size_t size) {
    std::vector<point> states;
    sy::weigh_options options;
    for (std::size_t i = 0; i < size; ++i) {
      states.push_back(state(seed, i));
      describe(i, states.back(), options);
    }
    return sy::weigh(std::move(states), weighter, std::move(options));
  }};
}

/// Prior weights: the ratio of two densities, times any constant.
template <class Sampler, class Ratio>
source with_prior_weights(Sampler sampler, Ratio ratio, weighter_of_points weighter) {
  return weighed(
      [=](std::uint64_t seed, std::size_t i) {
        sy::draws own(seed, i);
        return sampler(own);
      },
      [=](std::size_t, point const& p, sy::weigh_options& options) { options.prior_weights.push_back(ratio(p)); },
      std::move(weighter));
}

using group_of_state = std::function<std::size_t(std::size_t i)>;
using group_member = std::function<point(sy::draws& common, sy::draws& own)>;

/// State i belongs to group `group_of(i)`: `member(common, own)` draws from words that the group shares and from its own.
inline source grouped(group_of_state group_of, group_member member, weighter_of_points weighter) {
  return weighed(
      [=](std::uint64_t seed, std::size_t i) {
        sy::draws common(seed, (std::uint64_t{1} << 40) + group_of(i)), own(seed, i);
        return member(common, own);
      },
      [=](std::size_t i, point const&, sy::weigh_options& options) {
        options.groups.push_back(static_cast<std::uint32_t>(7 * group_of(i) + 3));
      },
      std::move(weighter));
}

/// Whole numbers: equal states of one group are one state with a count, prior weights where a ratio is not 1.
inline source counted(group_of_state group_of, group_member member, std::function<double(point const&)> ratio,
                      weighter_of_points weighter) {
  return {[=](std::uint64_t seed, std::size_t size) {
    std::map<std::pair<std::size_t, double>, std::uint64_t> seen;
    for (std::size_t i = 0; i < size; ++i) {
      sy::draws common(seed, (std::uint64_t{1} << 40) + group_of(i)), own(seed, i);
      ++seen[{group_of(i), member(common, own).x}];
    }
    std::vector<point> states;
    std::vector<double> ratios;
    sy::weigh_options options;
    bool weighted = false;
    for (auto const& [what, m] : seen) {
      states.push_back({what.second, 0.0});
      ratios.push_back(ratio(states.back()));
      weighted = weighted || ratios.back() != 1.0;
      options.counts.push_back(m);
      if (group_of(1) != group_of(0)) options.groups.push_back(static_cast<std::uint32_t>(what.first));
    }
    if (weighted) options.prior_weights = std::move(ratios);
    return sy::weigh(std::move(states), weighter, std::move(options));
  }};
}

// --- samplers -------------------------------------------------------------------------------------------------------------

inline auto normal_prior(double mean, double sd) {
  return [=](sy::draws& d) { return point{d.normal(mean, sd)}; };
}
inline auto lognormal_prior(double mean, double sd) {
  return [=](sy::draws& d) { return point{std::exp(d.normal(mean, sd))}; };
}
inline auto uniform_prior(double low, double high) {
  return [=](sy::draws& d) { return point{d.uniform(low, high)}; };
}
/// The sum of `shape` exponentials.
inline auto gamma_prior(int shape, double rate) {
  return [=](sy::draws& d) {
    point p;
    for (int k = 0; k < shape; ++k) p.x += d.exponential(rate);
    return p;
  };
}
inline double poisson_draw(sy::draws& d, double mean) {
  double const u = d.uniform();
  double term = std::exp(-mean), sum = term, k = 0.0;
  while (sum < u && k < 200.0) sum += term *= mean / ++k;
  return k;
}
inline auto poisson_prior(double mean) {
  return [=](sy::draws& d) { return point{poisson_draw(d, mean)}; };
}
inline auto student_prior(int degrees) {
  return [=](sy::draws& d) {
    double squares = 0.0;
    for (int k = 0; k < degrees; ++k) {
      double const z = d.normal();
      squares += z * z;
    }
    return point{d.normal() / std::sqrt(squares / degrees)};
  };
}
/// x the first of n standard normals, y their sum.
inline auto first_of(int n) {
  return [=](sy::draws& d) {
    point p{d.normal(), 0.0};
    p.y = p.x;
    for (int k = 1; k < n; ++k) p.y += d.normal();
    return p;
  };
}
/// Standard normals x and y with this correlation.
inline auto pair_of(double correlation) {
  return [=](sy::draws& d) {
    double const y = d.normal();
    return point{correlation * y + std::sqrt(1.0 - correlation * correlation) * d.normal(), y};
  };
}
/// Standard normal, but no state where it is below this.
inline auto failing_below(double least) {
  return [=](sy::draws& d) {
    double const x = d.normal();
    return x < least ? std::optional<point>() : std::optional<point>(point{x});
  };
}
/// Members of a group: standard normals with this correlation.
inline auto normal_member(double correlation) {
  return [=](sy::draws& common, sy::draws& own) {
    return point{std::sqrt(correlation) * common.normal() + std::sqrt(1.0 - correlation) * own.normal()};
  };
}
/// Members of a group: Poisson counts that share a part.
inline auto poisson_member(double shared, double rest) {
  return [=](sy::draws& common, sy::draws& own) { return point{poisson_draw(common, shared) + poisson_draw(own, rest)}; };
}
inline auto even_groups(std::size_t n) {
  return [=](std::size_t i) { return i % n; };
}
/// n groups, half of the states in a tenth of them.
inline auto uneven_groups(std::size_t n) {
  return [=](std::size_t i) { return i % 2 == 0 ? i / 2 % n : i / 2 % ((n + 9) / 10); };
}

// --- weighters ------------------------------------------------------------------------------------------------------------

inline auto normal_reading(double reading, double sd) {
  return [=](point const& p) { return sy::log_likelihood{log_normal_density(reading, p.x, sd)}; };
}
inline auto normal_reading_of_y(double reading, double sd) {
  return [=](point const& p) { return sy::log_likelihood{log_normal_density(reading, p.y, sd)}; };
}
/// From the log-likelihood as a function of x.
template <class F>
auto scored(F f) {
  return [=](point const& p) { return sy::log_likelihood{f(p.x)}; };
}
inline auto no_reading() {
  return [](point const&) { return sy::log_likelihood{0.0}; };
}
inline auto window(double low, double high) {
  return [=](point const& p) { return sy::likelihood{p.x > low && p.x < high ? 1.0 : 0.0}; };
}
/// Log-likelihood of a display that shows steps and rounds what has normal noise.
inline auto rounded_score(double shown, double step, double sd) {
  return [=](double x) {
    double const low = (shown - 0.5 * step - x) / sd, high = (shown + 0.5 * step - x) / sd;
    double const chance = x < shown ? normal_below(high) - normal_below(low) : normal_below(-low) - normal_below(-high);
    return std::log(std::max(chance, 1e-300));
  };
}

}  // namespace known
