// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <concepts>
#include <cstddef>
#include <cstdint>
#include <iterator>
#include <memory>
#include <span>
#include <string>
#include <type_traits>
#include <utility>
#include <vector>

#include <steelyard/base/algorithm.hpp>
#include <steelyard/base/bits.hpp>
#include <steelyard/base/text.hpp>
#include <steelyard/sample/resample.hpp>
#include <steelyard/sample/weighted_sample.hpp>
#include <steelyard/weigh/front_door.hpp>

namespace steelyard::inline v1 {

/// What may be known of an ensemble that some other program computed.
struct weigh_options {
  std::vector<double> prior_weights = {};         ///< one a state, zero or more; or
  std::vector<double> log_prior_weights = {};     ///< their logarithms, minus infinity allowed
  std::vector<std::uint64_t> counts = {};         ///< how many samples each state stands for
  std::vector<std::uint32_t> groups = {};         ///< any labels: states of one label are not independent
  steelyard::executor executor = {};              ///< how the states are scored; in turn unless given
};

namespace detail {

/// True for array types with an overload of their own.
template <class Range>
inline constexpr bool weighed_as_array = false;

inline void refuse_length(char const* what, std::size_t length, std::size_t size) {
  if (length != 0 && length != size)
    throw bad_argument(std::string("weigh: there are ") + std::to_string(length) + " " + what + " for " +
                       std::to_string(size) + " states; one each is needed");
}

/// Base log-weights from prior weights or their logarithms; empty where neither is given.
inline std::vector<double> base_of(weigh_options const& options) {
  if (!options.prior_weights.empty() && !options.log_prior_weights.empty())
    throw bad_argument("weigh: prior weights are given twice, plain and as logarithms; give one of them");
  std::vector<double> base;
  for (std::size_t i = 0; i < options.prior_weights.size(); ++i) {
    double const w = options.prior_weights[i];
    if (!is_finite(w) || w < 0.0)
      throw bad_weight("weigh: the prior weight of state " + std::to_string(i) + " is " + plain_number(w) +
                       "; it must be finite and zero or more");
    base.push_back(w > 0.0 ? portable_log(w) : impossible);
  }
  for (std::size_t i = 0; i < options.log_prior_weights.size(); ++i) {
    double const b = options.log_prior_weights[i];
    if (!is_finite(b) && !is_minus_infinite(b))
      throw bad_weight("weigh: the logarithm of the prior weight of state " + std::to_string(i) + " is " + plain_number(b) +
                       "; it must be finite or minus infinity");
    base.push_back(is_finite(b) ? b : impossible);
  }
  return base;
}

/// A state that counts for no sample was never drawn: its base weight is zero.
inline void rule_out_uncounted(std::vector<double>& base, std::vector<std::uint64_t> const& counts) {
  for (std::size_t i = 0; i < counts.size(); ++i) {
    if (counts[i] > 0) continue;
    if (base.empty()) base.assign(counts.size(), 0.0);
    base[i] = impossible;
  }
}

template <class X, class Holder, class Weighter>
weighted_sample<X> weigh_states(Holder states, std::size_t size, Weighter const& weighter, weigh_options options) {
  if (size == 0) throw bad_argument("weigh: the ensemble is empty; at least one state is needed");
  refuse_length("prior weights", options.prior_weights.size(), size);
  refuse_length("logarithms of prior weights", options.log_prior_weights.size(), size);
  refuse_length("counts", options.counts.size(), size);
  refuse_length("groups", options.groups.size(), size);
  if (!options.counts.empty() && std::all_of(options.counts.begin(), options.counts.end(), [](auto m) { return m == 0; }))
    throw no_likelihood("weigh: every count is zero");
  sample_columns prior;
  prior.base = base_of(options);
  rule_out_uncounted(prior.base, options.counts);
  prior.log_weights.assign(size, 0.0);
  if (!prior.base.empty()) {
    prior.base_maximum = *std::max_element(prior.base.begin(), prior.base.end());
    if (!(prior.base_maximum > impossible)) throw no_likelihood("weigh: every prior weight is zero");
  }
  auto origin = std::make_shared<sample_origin>();
  origin->execute = std::move(options.executor);
  origin->drawn = size;
  if (!options.counts.empty()) origin->take_counts(std::move(options.counts));
  origin->take_labels(options.groups);
  origin->how = options.groups.empty() ? how_drawn::independent : how_drawn::labelled;
  note_doubts(*origin, weighter);
  auto store = std::make_shared<kept_states<X, Holder> const>(std::move(states));
  sample_columns scored = score_states<X>(*store, prior, *origin, weighter);
  return weighted_sample<X>(std::move(store), std::move(scored), std::move(origin), "weigh");
}

}  // namespace detail

namespace detail {

/// True for a range that owns its elements (const reaches them) and is handed over: they may be moved out.
template <class Range>
inline constexpr bool gives_elements_v =
    !std::is_reference_v<Range> && !std::is_const_v<Range> &&
    std::is_same_v<decltype(*std::begin(std::declval<Range&>())), std::iter_value_t<decltype(std::begin(std::declval<Range&>()))>&> &&
    std::is_const_v<std::remove_reference_t<decltype(*std::begin(std::declval<Range const&>()))>>;

}  // namespace detail

/// Weighs an ensemble as it stands: the states of a range, one after another.
/// A vector passed as an rvalue is moved, as are the elements of any other container; `std::span<X const>` is
/// borrowed and must outlive the sample; lvalues are copied.
/// @throws bad_argument  for an empty range or options of another length
/// @throws bad_weight    for a likelihood or prior weight that is no number, negative or infinite
/// @throws no_likelihood where no state has any
template <class Range, class Weighter>
  requires(!detail::weighed_as_array<Range> && requires(Range&& range) {
    std::begin(range);
    std::end(range);
  })
auto weigh(Range&& range, Weighter const& weighter, weigh_options options = {}) {
  using X = std::iter_value_t<decltype(std::begin(range))>;
  constexpr bool fine = detail::may_weigh<true, Weighter, X>();
  if constexpr (fine) {
    using R = std::remove_cvref_t<Range>;
    if constexpr (std::is_same_v<R, std::span<X const>>) {
      return detail::weigh_states<X>(range, range.size(), weighter, std::move(options));
    } else if constexpr (std::is_same_v<R, std::vector<X>> && !std::is_same_v<X, bool> && !std::is_lvalue_reference_v<Range> &&
                         !std::is_const_v<std::remove_reference_t<Range>>) {
      std::size_t const size = range.size();
      return detail::weigh_states<X>(std::move(range), size, weighter, std::move(options));
    } else {
      detail::state_array<X> own;
      if constexpr (detail::gives_elements_v<Range>) {
        for (auto& each : range) own.emplace_back(std::move(each));
      } else {
        constexpr bool copies = std::is_constructible_v<X, decltype(*std::begin(range))>;
        static_assert(copies, "steelyard: weigh() copies the states it is not handed, and these cannot be copied: pass "
                              "std::move(states), or borrow them as std::span<X const>");
        if constexpr (copies)
          for (auto&& each : range) own.emplace_back(std::forward<decltype(each)>(each));
      }
      std::size_t const size = own.size();
      return detail::weigh_states<X>(std::move(own), size, weighter, std::move(options));
    }
  } else {
    return detail::refused<weighted_sample<X>>();
  }
}

}  // namespace steelyard::inline v1
