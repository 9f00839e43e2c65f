// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <array>
#include <concepts>
#include <cstddef>
#include <string>
#include <string_view>
#include <type_traits>

#include <steelyard/base/error.hpp>
#include <steelyard/base/text.hpp>
#include <steelyard/instrument/checks.hpp>

namespace steelyard::inline v1 {

namespace detail {

/// Number of a class, from any integer, truth value or enumerator.
template <class Class>
concept class_like = std::integral<Class> || std::is_enum_v<Class>;

/// The class as an index below K; K itself where it is none.
template <std::size_t K, class_like Class>
constexpr std::size_t class_index(Class value) noexcept {
  if constexpr (std::is_enum_v<Class>) {
    return class_index<K>(static_cast<std::underlying_type_t<Class>>(value));
  } else {
    if constexpr (std::signed_integral<Class>)
      if (value < 0) return K;
    return static_cast<std::size_t>(value) < K ? static_cast<std::size_t>(value) : K;
  }
}

}  // namespace detail

/// How a grader takes K classes for one another: row = true class, column =
/// the label it gives. Made by `confusion_matrix` or `confusion_counts`.
template <std::size_t K>
class confusion {
  static_assert(K >= 2, "steelyard: a confusion matrix needs at least two classes");

 public:
  using table = std::array<std::array<double, K>, K>;

  /// @param weights of the labels in each row; `known`: the rows are exact, else
  ///        they are the parameters of independent Dirichlet laws
  confusion(table const& weights, bool known) : weight_(weights), known_(known) {
    for (std::size_t k = 0; k < K; ++k)
      for (double const each : weights[k]) total_[k] += each;
  }

  /// P(label | class), averaged over what is not known about the rows.
  [[nodiscard]] double probability(std::size_t label, std::size_t true_class) const {
    return weight_[true_class][label] / total_[true_class];
  }
  /// True where the rows themselves are uncertain.
  [[nodiscard]] bool uncertain() const noexcept { return !known_; }

  /// What one more item of a known class, graded `label`, would teach.
  void learn(std::size_t label, std::size_t true_class) {
    if (known_) return;
    weight_[true_class][label] += 1.0;
    total_[true_class] += 1.0;
  }

 private:
  table weight_;
  std::array<double, K> total_{};
  bool known_;
};

/// A confusion matrix taken as exact.
/// @param rows P(label | true class), row = true class; each sums to 1
/// @throws bad_argument where an entry is negative or a row does not sum to 1 within 1e-9
template <std::size_t K>
confusion<K> confusion_matrix(std::array<std::array<double, K>, K> const& rows) {
  for (std::size_t k = 0; k < K; ++k) {
    double sum = 0.0;
    for (double const each : rows[k]) sum += detail::share("confusion_matrix", "an entry", each);
    if (!(sum > 1.0 - 1e-9 && sum < 1.0 + 1e-9))
      throw bad_argument("confusion_matrix: row " + std::to_string(k) + " sums to " + detail::plain_number(sum) +
                         "; the labels of one true class must sum to 1");
  }
  return confusion<K>(rows, true);
}

/// A confusion matrix known from items of known class: counts of labels, row =
/// true class. Each row keeps the uncertainty of its counts: a Dirichlet law with
/// parameters count + prior (prior 0.5: Jeffreys; 0: the raw shares).
///   For one item P(label | class) is the row's mean (count + prior) / (row sum + K prior),
///   and that is exact: its probability is linear in the row. Several items
///   share one unknown row; see label_grader.
/// @throws bad_argument where a count or the prior is negative, or a row is empty with prior 0
template <std::size_t K>
confusion<K> confusion_counts(std::array<std::array<double, K>, K> const& counts, double prior = 0.5) {
  detail::not_negative("confusion_counts", "a prior", prior);
  auto weights = counts;
  for (std::size_t k = 0; k < K; ++k) {
    double sum = 0.0;
    for (double& each : weights[k]) sum += each = detail::not_negative("confusion_counts", "a count", each) + prior;
    if (!(sum > 0.0))
      throw bad_argument("confusion_counts: no item of class " + std::to_string(k) +
                         " was graded; give a prior above 0");
  }
  return confusion<K>(weights, false);
}

namespace detail {

template <std::size_t K>
std::array<std::array<double, K>, K> rows_of(double const (&rows)[K][K]) {
  std::array<std::array<double, K>, K> table{};
  for (std::size_t k = 0; k < K; ++k)
    for (std::size_t j = 0; j < K; ++j) table[k][j] = rows[k][j];
  return table;
}

}  // namespace detail

/// The same from nested braces: confusion_matrix({{0.9, 0.1}, {0.2, 0.8}})
template <std::size_t K>
confusion<K> confusion_matrix(double const (&rows)[K][K]) {
  return confusion_matrix(detail::rows_of(rows));
}
template <std::size_t K>
confusion<K> confusion_counts(double const (&counts)[K][K], double prior = 0.5) {
  return confusion_counts(detail::rows_of(counts), prior);
}

}  // namespace steelyard::inline v1
