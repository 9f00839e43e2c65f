// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <algorithm>
#include <array>
#include <cstddef>
#include <string>
#include <string_view>

#include <boost/math/special_functions/gamma.hpp>

#include <steelyard/instrument/label_grader.hpp>
#include <steelyard/instrument/quiet.hpp>

namespace steelyard::inline v1 {

/// What is known of a grader that returns scores.
template <std::size_t K>
struct grader_setting {
  /// Shares of the classes among the items the grader was trained on, which its
  /// scores have already taken into account; they need not be those of today.
  std::array<double, K> prevalence = even();
  /// For fakes alone: how spread its scores are; below K mostly near 0 and 1.
  double concentration = static_cast<double>(K);

 private:
  static constexpr std::array<double, K> even() {
    std::array<double, K> shares{};
    for (double& each : shares) each = 1.0 / static_cast<double>(K);
    return shares;
  }
};

/// Made by `class_grader`.
template <std::size_t K>
class grader_instrument {
 public:
  using truth_type = std::size_t;

  grader_instrument(confusion<K> const& labels, grader_setting<K> const& setting) : labels_(labels), setting_(setting) {
    double sum = 0.0;
    for (double const each : setting.prevalence) sum += detail::positive(name(), "a prevalence", each);
    if (!(sum > 1.0 - 1e-9 && sum < 1.0 + 1e-9))
      throw bad_argument("class_grader: the prevalences sum to " + detail::plain_number(sum) + "; they must sum to 1");
    detail::positive(name(), "a concentration", setting.concentration);
  }

  [[nodiscard]] std::string_view name() const noexcept { return "class_grader"; }

  /// @throws bad_argument where scores are no shares that sum to 1 within 1 %
  template <class Number>
  void check(std::array<Number, K> const& scores) const {
    (void)total(scores);
  }

  /// log sum_j P(label j | class) s_j / prevalence_j, with the scores s scaled to sum 1.
  template <class Number, detail::class_like Class>
  log_likelihood score(std::array<Number, K> const& scores, Class truth) const {
    double const whole = total(scores);
    std::size_t const k = detail::true_class<K>(name(), detail::class_index<K>(truth));
    double sum = 0.0;
    for (std::size_t j = 0; j < K; ++j)
      sum += labels_.probability(j, k) * static_cast<double>(scores[j]) / setting_.prevalence[j];
    return log_likelihood{detail::portable_log(sum / whole)};
  }

  /// Scores of a grader whose scores are right on average over its training
  /// items: Dirichlet(concentration prevalence), tilted towards a drawn label.
  template <detail::class_like Class>
  std::array<double, K> draw(Class truth, draws& d) const {
    std::size_t const k = detail::true_class<K>(name(), detail::class_index<K>(truth));
    std::size_t const label = detail::draw_label(labels_, k, d);
    std::array<double, K> scores{};
    double top = detail::impossible, sum = 0.0;
    for (std::size_t j = 0; j < K; ++j) {
      double const shape = setting_.concentration * setting_.prevalence[j] + (j == label ? 1.0 : 0.0);
      scores[j] = log_gamma_deviate(shape, d);
      top = std::max(top, scores[j]);
    }
    for (double& each : scores) sum += each = detail::portable_exp(each - top);
    for (double& each : scores) each /= sum;
    return scores;
  }

 private:
  template <class Number>
  [[nodiscard]] double total(std::array<Number, K> const& scores) const {
    double sum = 0.0;
    for (Number const each : scores) sum += detail::share(name(), "a score", static_cast<double>(each));
    if (sum > 0.99 && sum < 1.01) return sum;
    throw bad_argument("class_grader: the scores sum to " + detail::plain_number(sum) +
                       "; they must be the shares of belief in all classes and sum to 1 within 1 %");
  }
  /// log of a gamma deviate, from shape + 1 so that small shapes do not vanish.
  static double log_gamma_deviate(double shape, draws& d) {
    detail::tail const t = detail::tail_from_word(d());
    double const raised = t.lower ? boost::math::gamma_p_inv(shape + 1.0, t.probability, detail::quiet{})
                                  : boost::math::gamma_q_inv(shape + 1.0, t.probability, detail::quiet{});
    return detail::portable_log(raised) + detail::portable_log(d.uniform()) / shape;
  }

  confusion<K> labels_;
  grader_setting<K> setting_;
};

/// A grader that returns one score for each of K classes, taken at its word:
/// the scores are its belief after seeing the item, so what the item itself
/// says is score / prevalence, the prevalence being that of its training items.
///   log likelihood = log(score_k / prevalence_k); 0 where it has learnt nothing
/// A score is a likelihood, not a threshold: 0.6 against 0.4 is weak evidence
/// and stays so. The factor it leaves out, how often such scores come up at
/// all, belongs to the reading alone and cancels between rival simulators.
/// @throws bad_argument unless prevalences are above 0 and sum to 1
/// Assumes  scores that are calibrated: of the training items scored 0.8 for a
///          class, 80 % were of it. Few graders are; see below.
template <std::size_t K>
grader_instrument<K> class_grader(grader_setting<K> const& setting = {}) {
  std::array<std::array<double, K>, K> same{};
  for (std::size_t k = 0; k < K; ++k) same[k][k] = 1.0;
  return {confusion<K>(same, true), setting};
}

/// The same, corrected by a confusion matrix found on items of known class: the
/// scores speak of the label the grader would give, the matrix of what that
/// label is worth.
///   log likelihood = log sum_j P(label j | class k) score_j / prevalence_j
/// With counts the matrix's own uncertainty is averaged over, which for one
/// item is exact (the sum is linear in each row). Readings of several items
/// through one uncertain matrix are not independent; label_grader with an array has their joint law.
template <std::size_t K>
grader_instrument<K> class_grader(confusion<K> const& labels, grader_setting<K> const& setting = {}) {
  return {labels, setting};
}

}  // namespace steelyard::inline v1
