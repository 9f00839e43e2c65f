// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <array>
#include <cstddef>
#include <string>
#include <string_view>

#include <steelyard/base/elementary.hpp>
#include <steelyard/draw/draws.hpp>
#include <steelyard/instrument/confusion.hpp>
#include <steelyard/instrument/log_sum.hpp>
#include <steelyard/weigh/likelihood.hpp>

namespace steelyard::inline v1 {

namespace detail {

template <std::size_t K>
std::size_t true_class(std::string_view who, std::size_t index) {
  if (index < K) return index;
  throw bad_readout(std::string(who) + ": a true class outside 0 to " + std::to_string(K - 1) + " makes no sense here");
}

/// A label drawn from one row.
template <std::size_t K>
std::size_t draw_label(confusion<K> const& from, std::size_t true_class, draws& d) {
  double rest = d.uniform();
  std::size_t label = 0, last = 0;
  for (; label < K; ++label) {
    double const p = from.probability(label, true_class);
    if (p > 0.0) last = label;
    rest -= p;
    if (rest < 0.0 && p > 0.0) return label;
  }
  return last;
}

}  // namespace detail

/// Made by `label_grader`.
template <std::size_t K>
class label_instrument {
 public:
  using truth_type = std::size_t;

  explicit label_instrument(confusion<K> const& labels) : labels_(labels) {}

  [[nodiscard]] std::string_view name() const noexcept { return "label_grader"; }

  /// @throws bad_argument for a label that is no class
  template <detail::class_like Label>
  void check(Label label) const {
    if (detail::class_index<K>(label) == K)
      throw bad_argument("label_grader: a label outside 0 to " + std::to_string(K - 1) + " can never be shown");
  }
  template <detail::class_like Label, std::size_t N>
  void check(std::array<Label, N> const& labels) const {
    for (Label const each : labels) check(each);
  }

  /// log P(label | class).
  /// @throws bad_argument, bad_readout for a label or truth that is no class
  template <detail::class_like Label, detail::class_like Class>
  log_likelihood score(Label label, Class truth) const {
    check(label);
    return log_likelihood{log_probability(labels_, detail::class_index<K>(label), detail::class_index<K>(truth))};
  }

  /// Labels of several items by one grader, whose rows are the same unknown for
  /// all: what earlier items teach about them counts for the later ones, so the
  /// order does not matter  [Dirichlet-multinomial law].
  template <detail::class_like Label, detail::class_like Class, std::size_t N>
  log_likelihood score(std::array<Label, N> const& labels, std::array<Class, N> const& truths) const {
    check(labels);
    confusion<K> known = labels_;
    double sum = 0.0;
    for (std::size_t i = 0; i < N; ++i) {
      std::size_t const label = detail::class_index<K>(labels[i]), truth = detail::class_index<K>(truths[i]);
      sum = detail::log_product(sum, log_probability(known, label, truth));
      known.learn(label, truth);
    }
    return log_likelihood{sum};
  }

  template <detail::class_like Class>
  std::size_t draw(Class truth, draws& d) const {
    return detail::draw_label(labels_, detail::true_class<K>(name(), detail::class_index<K>(truth)), d);
  }
  template <detail::class_like Class, std::size_t N>
  std::array<std::size_t, N> draw(std::array<Class, N> const& truths, draws& d) const {
    confusion<K> known = labels_;
    std::array<std::size_t, N> labels{};
    for (std::size_t i = 0; i < N; ++i) {
      std::size_t const truth = detail::true_class<K>(name(), detail::class_index<K>(truths[i]));
      labels[i] = detail::draw_label(known, truth, d);
      known.learn(labels[i], truth);
    }
    return labels;
  }

 private:
  [[nodiscard]] double log_probability(confusion<K> const& rows, std::size_t label, std::size_t truth) const {
    return detail::portable_log(rows.probability(label, detail::true_class<K>(name(), truth)));
  }

  confusion<K> labels_;
};

/// A grader that names one of K classes: a person, a sorting machine, a test
/// that is positive or negative. Reading: the label; truth: the class; both
/// counted from 0, as integers, truth values or enumerators.
///   P(label | class) from a confusion matrix, its uncertainty included
template <std::size_t K>
label_instrument<K> label_grader(confusion<K> const& labels) {
  return label_instrument<K>(labels);
}

}  // namespace steelyard::inline v1
