// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cmath>
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
#include <steelyard/base/functional.hpp>
#include <steelyard/estimate/bins.hpp>
#include <steelyard/estimate/estimate.hpp>
#include <steelyard/estimate/expectation.hpp>
#include <steelyard/estimate/quantile.hpp>
#include <steelyard/sample/scheme.hpp>
#include <steelyard/sample/state_store.hpp>
#include <steelyard/weigh/concepts.hpp>

namespace steelyard::inline v1 {

template <class X>
class weighted_sample;

namespace detail {

template <class X>
std::vector<double> plain_weights(weighted_sample<X> const& sample);

/// Error of a mean over k slots that were drawn from a weighted sample: the
/// parent's own error and that of the resampling, which are independent. Few groups of the parent stay the judges.
inline estimate resampled_estimate(double value, estimate const& parent, double variance, double carriers, double k,
                                   bool event) {
  double const own = parent.standard_error * parent.standard_error;
  run_facts facts;
  facts.drawn = 0;
  facts.sum = parent.effective_size;
  facts.sum_squares = parent.effective_size;
  facts.how = how_drawn::labelled;
  facts.group_share_squares = 0.0;
  facts.groups = estimate::few_groups + 1.0;  // more units than few: carriers decide
  if (event && (value == 0.0 || value == 1.0)) {
    facts.groups = 0.0;
    facts.largest_unit = 1.0 / k + (parent.effective_size > 0.0 ? 1.0 / parent.effective_size : 1.0);
    return estimate::one_sided(value == 1.0, facts);
  }
  error_scale const scale = event ? error_scale::logit : error_scale::linear;
  if (parent.groups() > 0.0) return parent.drawn_again(value, variance, carriers, scale);
  error_terms terms;
  terms.sum_squares = own + variance;
  terms.sum_fourth = (parent.carriers > 0.0 ? own * own / parent.carriers : 0.0) +
                     (carriers > 0.0 ? variance * variance / carriers : 0.0);
  return estimate(value, terms, facts, scale);
}

/// Takes in a whole kept sample and answers how much the mean over k slots varies from draw to draw.
template <class Readout>
class resampling_error_estimator : public column_estimator<Readout> {
 public:
  resampling_error_estimator(Readout const& its_readout, scheme how, std::size_t k)
      : column_estimator<Readout>(its_readout), scheme_(how), k_(k) {}
  [[nodiscard]] resampling_error_estimator fresh() const { return {this->readout(), scheme_, k_}; }
  [[nodiscard]] double answer(run_facts const&) const {
    weighted_view const all = this->view();
    std::vector<double> weights(all.weights.begin(), all.weights.end());
    for (std::size_t i = 0; i < weights.size(); ++i) weights[i] *= all.count(i);
    return resampling_variance(scheme_, weights, all.values, k_);
  }

 private:
  scheme scheme_;
  std::size_t k_;
};

/// Some states of another store, in order; those of a store in memory are looked at where they lie.
template <class X>
class chosen_states final : public state_store<X> {
 public:
  chosen_states(std::shared_ptr<state_store<X> const> from, std::vector<std::size_t> places)
      : from_(std::move(from)), places_(std::move(places)) {}
  [[nodiscard]] X const* data() const noexcept override { return nullptr; }
  void visit(std::span<std::size_t const> positions, typename state_store<X>::look const& act) const override {
    for (std::size_t const i : positions) act(i, from_->data()[places_[i]]);
  }
  void remake(std::span<std::size_t const> positions, std::function<void(X&&)> const& take) const override {
    std::vector<std::size_t> places;
    for (std::size_t const i : positions) places.push_back(places_[i]);
    from_->remake(places, take);
  }

 private:
  std::shared_ptr<state_store<X> const> from_;
  std::vector<std::size_t> places_;
};

}  // namespace detail

/// States that stand for a weighted sample: slots that refer to shared states,
/// equal after a draw with replacement, weighted after one without. A random-access range of `X const&`.
template <class X>
class ensemble {
 public:
  using value_type = X;

  class iterator {
   public:
    using iterator_category = std::random_access_iterator_tag;
    using value_type = X;
    using difference_type = std::ptrdiff_t;
    using pointer = X const*;
    using reference = X const&;

    iterator() = default;
    iterator(ensemble const* of, std::size_t at) : of_(of), at_(at) {}
    reference operator*() const { return (*of_)[at_]; }
    pointer operator->() const { return &(*of_)[at_]; }
    reference operator[](difference_type n) const { return *(*this + n); }
    iterator& operator++() { return *this += 1; }
    iterator& operator--() { return *this += -1; }
    iterator operator++(int) {
      iterator const old = *this;
      ++*this;
      return old;
    }
    iterator operator--(int) {
      iterator const old = *this;
      --*this;
      return old;
    }
    iterator& operator+=(difference_type n) {
      at_ = static_cast<std::size_t>(static_cast<difference_type>(at_) + n);
      return *this;
    }
    iterator& operator-=(difference_type n) { return *this += -n; }
    friend iterator operator+(iterator a, difference_type n) { return a += n; }
    friend iterator operator+(difference_type n, iterator a) { return a += n; }
    friend iterator operator-(iterator a, difference_type n) { return a -= n; }
    friend difference_type operator-(iterator const& a, iterator const& b) {
      return static_cast<difference_type>(a.at_) - static_cast<difference_type>(b.at_);
    }
    friend bool operator==(iterator const& a, iterator const& b) { return a.at_ == b.at_; }
    friend auto operator<=>(iterator const& a, iterator const& b) { return a.at_ <=> b.at_; }

   private:
    ensemble const* of_ = nullptr;
    std::size_t at_ = 0;
  };

  [[nodiscard]] std::size_t size() const noexcept { return indices_.size(); }
  [[nodiscard]] X const& operator[](std::size_t slot) const noexcept { return states_->data()[places_[slot]]; }
  [[nodiscard]] iterator begin() const noexcept { return {this, 0}; }
  [[nodiscard]] iterator end() const noexcept { return {this, size()}; }

  /// For each slot: which state of the parent it is; after a one-pass resample, which stream.
  [[nodiscard]] std::span<std::size_t const> indices() const noexcept { return indices_; }
  /// The stream that a slot's state was drawn from: `pipe.replay(plan, sample_index(slot))` makes it again.
  /// @throws bad_argument for slot >= size().
  std::uint64_t sample_index(std::size_t slot) const {
    if (slot >= size())
      throw bad_argument("sample_index: there is no slot " + std::to_string(slot) + " among " + std::to_string(size()));
    return parent_ ? parent_->sample_index(indices_[slot]) : indices_[slot];
  }
  /// For each slot, after a draw without replacement: an unbiased estimate of its state's normalised weight, 0 for
  /// states not drawn. They add up to about one. Empty after a draw with replacement, where slots are equal.
  [[nodiscard]] std::span<double const> weights() const noexcept { return slot_weights_; }
  /// Each state that was drawn, in order, with how often.
  [[nodiscard]] std::vector<std::pair<std::size_t, std::size_t>> copies() const {
    std::vector<std::size_t> sorted(indices_.begin(), indices_.end());
    std::sort(sorted.begin(), sorted.end());
    std::vector<std::pair<std::size_t, std::size_t>> all;
    for (std::size_t const i : sorted) {
      if (all.empty() || all.back().first != i) all.emplace_back(i, 0);
      ++all.back().second;
    }
    return all;
  }

  /// Mean over the slots, with the parent's error plus that of the resampling.
  template <class Readout>
  auto expectation(Readout readout) const {
    constexpr std::size_t columns = readout_columns<detail::result_t<Readout, X const&>>::size;
    static_assert(columns > 0, "steelyard: expectation() takes a readout that returns a number, or a std::array of numbers");
    if constexpr (columns > 1)
      return as_sample().expectation(readout);
    else if constexpr (columns == 1)
      return slot_weights_.empty() ? mean_of(readout, false) : as_sample().expectation(readout);
  }
  /// Share of the slots where an event holds, with the parent's error plus that of the resampling.
  template <class Event>
  steelyard::estimate probability(Event event) const {
    constexpr bool fine = event_for<Event, X>;
    static_assert(fine, "steelyard: probability() takes an event: a readout that returns bool");
    if constexpr (fine)
      return slot_weights_.empty() ? mean_of(event, true) : as_sample().probability(event);
    else
      return {};
  }

  /// The states drawn, each once, as a weighted sample to ask anything of: base weights are the numbers of copies, or
  /// the weights of a draw without replacement, and groups are the parent's.
  ///   Its error bars hold the parent's error and that of the resampling, without a look at the parent: a state of
  ///   weight W is drawn m times with E m^2 = (k W)^2 + var m, so that sum (m/k)^2 (f-mu)^2 has both. What systematic
  ///   and stratified draws save on states in an order of their own is left out, so they may be too wide, not too
  ///   narrow; `expectation` and `probability` know it.
  /// `before()`, `reweigh` and `log_evidence` take the ensemble for what was known before.
  weighted_sample<X> as_sample() const;

  /// Answers to several questions at once, as `as_sample()` gives them.
  template <class... Es>
  auto estimate(Es const&... questions) const {
    return as_sample().estimate(questions...);
  }
  template <class Readout, class Edges = automatic_bins_t>
  auto histogram(Readout readout, Edges edges = {}) const {
    return as_sample().histogram(std::move(readout), std::move(edges));
  }
  template <class Readout>
  auto quantile(Readout readout, double p) const {
    return as_sample().quantile(std::move(readout), p);
  }
  template <class Readout>
  auto interval(Readout readout, double level) const {
    return as_sample().interval(std::move(readout), level);
  }

  /// @cond for the other parts of the library
  /// Slots of a kept or replayed parent; `places` say where in `states` each slot lies.
  ensemble(std::shared_ptr<detail::state_store<X> const> states, std::vector<std::size_t> places,
           detail::drawn_slots slots, std::shared_ptr<weighted_sample<X> const> parent, steelyard::scheme how)
      : states_(std::move(states)), places_(std::move(places)), indices_(std::move(slots.positions)),
        slot_weights_(std::move(slots.weights)), parent_(std::move(parent)), scheme_(how) {}
  /// Slots of a one-pass run with the normalised weight of each slot's state.
  ensemble(std::shared_ptr<detail::state_store<X> const> states, std::vector<std::size_t> places,
           std::vector<std::size_t> indices, std::vector<double> weights, double effective_size)
      : states_(std::move(states)), places_(std::move(places)), indices_(std::move(indices)), weights_(std::move(weights)),
        effective_size_(effective_size), scheme_(steelyard::scheme::multinomial) {}
  /// @endcond

 private:
  template <class Readout>
  steelyard::estimate mean_of(Readout const& readout, bool event) const {
    double const k = static_cast<double>(size());
    detail::instance_t<Readout> own = detail::instance_of<Readout>::make(readout);
    std::vector<double> values(size());
    double mean = 0.0;
    for (std::size_t s = 0; s < size(); ++s) {
      values[s] = static_cast<double>(detail::call(own, (*this)[s]));
      mean += (values[s] - mean) / static_cast<double>(s + 1);
    }
    double squares = 0.0, fourth = 0.0, weighted = 0.0, weighted_fourth = 0.0;
    for (std::size_t s = 0; s < size(); ++s) {
      double const d = (values[s] - mean) * (values[s] - mean);
      squares += d;
      fourth += d * d;
      if (!weights_.empty()) {
        weighted += weights_[s] * d;
        weighted_fourth += (weights_[s] * d) * (weights_[s] * d) * weights_[s];
      }
    }
    double const carriers = fourth > 0.0 ? squares * (squares / fourth) : 0.0;
    double const variance = k > 1.0 ? squares / (k * (k - 1.0)) : 0.0;
    if (parent_) {
      auto const asked = parent_->estimate(steelyard::expectation(readout),
                                           detail::resampling_error_estimator<std::decay_t<Readout>>(readout, scheme_, size()));
      return detail::resampled_estimate(mean, asked.template get<0>(), asked.template get<1>(), carriers, k, event);
    }
    // Without the parent: sum W^2 d over it is the mean of W d over draws in proportion to W.
    steelyard::estimate whole;
    whole.standard_error = std::sqrt(weighted / k);
    whole.carriers = weighted_fourth > 0.0 ? (weighted / k) * (weighted / k) / (weighted_fourth / k) : 0.0;
    whole.effective_size = effective_size_;
    return detail::resampled_estimate(mean, whole, variance, carriers, k, event);
  }

  std::shared_ptr<detail::state_store<X> const> states_;
  std::vector<std::size_t> places_;
  std::vector<std::size_t> indices_;
  std::vector<double> slot_weights_;
  std::vector<double> weights_;
  double effective_size_ = 0.0;
  std::shared_ptr<weighted_sample<X> const> parent_;
  steelyard::scheme scheme_;
};

}  // namespace steelyard::inline v1
