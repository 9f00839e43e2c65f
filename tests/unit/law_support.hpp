// SPDX-License-Identifier: BSL-1.0
#pragma once

// Tools for the tests of laws: answers compared bit by bit or within a relative
// difference, executors of other kinds, and a small problem with a known answer.

#include <algorithm>
#include <array>
#include <bit>
#include <cmath>
#include <cstddef>
#include <cstdint>
#include <future>
#include <limits>
#include <string>
#include <vector>

#include <steelyard/core.hpp>

namespace law {

namespace sy = steelyard;
using all_bits = std::vector<std::uint64_t>;

inline void put(all_bits& to, double x) { to.push_back(std::bit_cast<std::uint64_t>(x)); }
inline void put(all_bits& to, sy::interval const& i) {
  put(to, i.lower);
  put(to, i.upper);
  to.push_back((i.lower_known ? 1u : 0u) + (i.upper_known ? 2u : 0u));
}
inline void put(all_bits& to, sy::estimate const& e) {
  for (double const x : {e.value, e.standard_error, e.effective_size, e.carriers, e.degrees_of_freedom}) put(to, x);
  to.push_back(static_cast<std::uint64_t>(e.verdict()));
  put(to, e.error_interval(0.95));
}
inline void put(all_bits& to, sy::quantile_result const& q) {
  put(to, static_cast<sy::estimate const&>(q));
  put(to, q.error_interval(0.9));
}
inline void put(all_bits& to, sy::interval_result const& i) {
  put(to, i.lower);
  put(to, i.upper);
}
template <std::size_t N>
void put(all_bits& to, sy::estimates<N> const& all) {
  for (std::size_t i = 0; i < N; ++i) {
    put(to, all[i]);
    for (std::size_t j = 0; j < N; ++j) put(to, all.covariance(i, j));
  }
}
inline void put(all_bits& to, sy::histogram_result const& h) {
  for (std::size_t b = 0; b < h.size(); ++b) {
    put(to, h.edge(b));
    put(to, h.probability(b));
    put(to, h.probability_inside(b));
  }
  put(to, h.below());
  put(to, h.above());
  put(to, h.not_a_number());
}
inline void put(all_bits& to, sy::diagnosis const& d) {
  for (double const x : {d.effective_size(), d.perplexity(), d.largest_share(), d.share_of_zeros()}) put(to, x);
  to.push_back(d.drawn());
  to.push_back(d.failed());
}
template <std::size_t I, class... As>
void put_from(all_bits& to, sy::answers<As...> const& all) {
  if constexpr (I < sizeof...(As)) {
    put(to, all.template get<I>());
    put_from<I + 1>(to, all);
  }
}
template <class... As>
void put(all_bits& to, sy::answers<As...> const& all) {
  put_from<0>(to, all);
  put(to, all.diagnosis());
}

/// Everything an answer says, as bits.
template <class Answer>
all_bits bits(Answer const& answer) {
  all_bits all;
  put(all, answer);
  return all;
}

/// The same answers from two places of the program. With -ffast-math a formula may be put in another order wherever it is
/// inlined, and then the last digits differ.
inline bool alike(all_bits const& a, all_bits const& b) {
#if defined(__FAST_MATH__)
  if (a.size() != b.size()) return false;
  for (std::size_t i = 0; i < a.size(); ++i) {
    if (a[i] == b[i]) continue;
    if ((a[i] << 1) >> 53 == 0) return false;  // a whole number, or zero
    double const x = std::bit_cast<double>(a[i]), y = std::bit_cast<double>(b[i]);
    if (!(std::abs(x - y) <= 1e-12 * std::abs(x))) return false;
  }
  return true;
#else
  return a == b;
#endif
}

/// Equal but for rounding.
inline bool close(double a, double b, double relative = 1e-12) {
  return std::abs(a - b) <= relative * std::max({std::abs(a), std::abs(b), 1e-300});
}
/// Value, standard error, effective size and carriers equal but for rounding, verdicts equal.
inline bool close(sy::estimate const& a, sy::estimate const& b, double relative = 1e-12) {
  return close(a.value, b.value, relative) && close(a.standard_error, b.standard_error, relative) &&
         close(a.effective_size, b.effective_size, relative) && close(a.carriers, b.carriers, relative) &&
         a.verdict() == b.verdict();
}

/// Distance from a published or exact number in reported standard errors.
inline double errors_off(sy::estimate const& e, double exact) { return std::abs(e.value - exact) / e.standard_error; }

/// Calls the tasks in turn, the last first.
inline sy::executor backwards() {
  return sy::executor([](std::size_t n, sy::executor::task const& f) {
    for (std::size_t i = n; i-- > 0;) f(i);
  });
}
/// Hands each task to std::async.
inline sy::executor by_async() {
  return sy::executor([](std::size_t n, sy::executor::task const& f) {
    std::vector<std::future<void>> running;
    for (std::size_t i = 0; i < n; ++i) running.push_back(std::async(std::launch::async, [&f, i] { f(i); }));
    for (auto& each : running) each.get();
  });
}

/// What is said when `act` throws an E; empty where it does not.
template <class E, class Act>
std::string said(Act act) {
  try {
    act();
  } catch (E const& e) {
    return e.what();
  }
  return {};
}
inline bool holds(std::string const& text, std::string const& words) { return text.find(words) != std::string::npos; }

/// Not a number and infinity, out of reach of an optimiser that was told they do not occur.
inline double volatile const hidden_nan = std::numeric_limits<double>::quiet_NaN();
inline double volatile const hidden_infinity = std::numeric_limits<double>::infinity();
inline double not_a_number() { return hidden_nan; }
inline double infinity() { return hidden_infinity; }

/// X ~ N(0, 1), read as 1 with sd 1: the posterior is N(0.5, 0.5).
inline double draw_normal(sy::draws& draws) { return draws.normal(); }
inline sy::log_likelihood read_one(double x) { return sy::log_likelihood{-0.5 * (1.0 - x) * (1.0 - x)}; }
inline double itself(double x) { return x; }
inline bool above_one(double x) { return x > 1.0; }

}  // namespace law
