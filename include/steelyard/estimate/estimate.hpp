// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cmath>
#include <cstddef>
#include <iosfwd>
#include <string>

#include <steelyard/base/bits.hpp>
#include <steelyard/base/elementary.hpp>
#include <steelyard/base/error.hpp>
#include <steelyard/base/student.hpp>
#include <steelyard/base/text.hpp>
#include <steelyard/estimate/interval.hpp>
#include <steelyard/estimate/run_facts.hpp>
#include <steelyard/estimate/verdict.hpp>

namespace steelyard::inline v1 {

/// What carries an error bar. With u_g = sum over the independent unit g of
/// W_i (f_i - mu), W normalised weights:
struct error_terms {
  double sum_squares = 0.0;     ///< sum u_g^2
  double sum_fourth = 0.0;      ///< sum u_g^4
  double largest_square = 0.0;  ///< largest u_g^2; needed for few groups only
};

/// On which scale an error interval is symmetric.
enum class error_scale { linear, logit };

/// A value, its Monte Carlo standard error, what carries it, and a verdict.
class estimate {
 public:
  double value = 0.0;
  double standard_error = 0.0;
  double effective_size = 0.0;      ///< Kish, of the whole sample: says nothing about one readout
  double carriers = 0.0;            ///< (sum u^2)^2 / sum u^4: how many terms carry the error bar
  double degrees_of_freedom = 0.0;  ///< of Student's t; 0: undefined, the error interval is unbounded

  estimate() = default;

  /// From the terms of the error bar: se^2 = c sum u_g^2.
  ///   verdict of single samples: sound if carriers >= 30 and effective size >= 50, broken if carriers < 5
  ///   verdict of at most 64 groups: sound if there are 8, none carries over half, and effective size >= 50;
  ///   broken if one carries 90 %. More groups than that count like single samples.
  ///   lineages: likewise whatever their number, with 20 effective lineages in place of the effective size.
  estimate(double its_value, error_terms const& terms, run_facts const& facts,
           error_scale scale = error_scale::linear)
      : value(its_value), effective_size(facts.effective_size()), scale_(scale) {
    standard_error = std::sqrt(facts.correction() * terms.sum_squares);
    bool const defined = terms.sum_squares > 0.0 && terms.sum_fourth > 0.0;
    carriers = defined ? terms.sum_squares * (terms.sum_squares / terms.sum_fourth) : 0.0;
    if (!defined) return;
    bool const lineages = facts.how == steelyard::how_drawn::lineages;
    if (facts.groups > 0.0 && (lineages || facts.groups <= few_groups)) {
      groups_ = facts.groups;
      degrees_of_freedom = facts.groups - 1.0;
      double const share = terms.largest_square / terms.sum_squares;
      bool const many = lineages ? facts.effective_groups() >= 20.0 && !facts.far_from_drawn : effective_size >= 50.0;
      bool const good = facts.groups >= 8.0 && share <= 0.5 && many;
      verdict_ = share >= 0.9 ? steelyard::verdict::broken
                              : good ? steelyard::verdict::sound : steelyard::verdict::strained;
    } else {
      degrees_of_freedom = carriers > 1.0 ? carriers - 1.0 : 0.0;
      bool const good = carriers >= 30.0 && effective_size >= 50.0;
      verdict_ = carriers < 5.0 ? steelyard::verdict::broken
                                : good ? steelyard::verdict::sound : steelyard::verdict::strained;
    }
  }

  /// An event that no sample met (value 0) or every sample met (value 1).
  ///   one-sided limit at level L: 1 - (1 - L)^(largest W); with a declared bound on the likelihood, the
  ///   prior chance is at most 1 - (1 - L)^(1/n), and the bound over the mean weight carries it over.
  [[nodiscard]] static estimate one_sided(bool always, run_facts const& facts) {
    estimate e;
    e.value = always ? 1.0 : 0.0;
    e.effective_size = facts.effective_size();
    e.scale_ = error_scale::logit;
    e.sided_ = always ? side::always : side::never;
    e.largest_unit_ = facts.largest_unit;
    if (facts.bound_known && facts.groups == 0.0 && facts.sum > 0.0) {
      double const n = static_cast<double>(facts.drawn);
      e.bound_factor_ = detail::portable_exp(facts.log_bound - facts.maximum) * (n / facts.sum);
      e.bound_size_ = n;
    }
    return e;
  }

  [[nodiscard]] steelyard::verdict verdict() const noexcept { return verdict_; }

  /// True where the event was met by no sample, or by every one.
  [[nodiscard]] bool never_seen() const noexcept { return sided_ == side::never; }
  [[nodiscard]] bool always_seen() const noexcept { return sided_ == side::always; }

  /// Where the exact answer lies, given Monte Carlo error: value -+ t se, on
  /// the logit scale for a probability; one-sided for an event never or always seen.
  /// @throws bad_argument for a level outside (0, 1).
  interval error_interval(double level) const {
    if (!detail::is_finite(level) || !(level > 0.0 && level < 1.0))
      throw bad_argument("error_interval: the level " + detail::plain_number(level) + " is outside (0, 1)");
    if (sided_ != side::both) {
      double const limit = one_sided_limit(level);
      return sided_ == side::never ? interval{0.0, unit_ * limit, true, true}
                                   : interval{unit_ * (1.0 - limit), unit_, true, true};
    }
    if (!(degrees_of_freedom > 0.0))
      return scale_ == error_scale::logit ? interval{0.0, unit_, false, false} : interval{};
    double const t = detail::student_upper_quantile(0.5 * (1.0 - level), degrees_of_freedom);
    if (scale_ == error_scale::linear)
      return {value - t * standard_error, value + t * standard_error, true, true};
    double const p = value / unit_;
    if (!(p > 0.0 && p < 1.0)) {  // so near 0 or 1 that no double lies between
      double const reach = t * standard_error, lower = value - reach, upper = value + reach;
      return {lower > 0.0 ? lower : 0.0, upper < unit_ ? upper : unit_, true, true};
    }
    double const odds = p / (1.0 - p);
    double const factor = detail::portable_exp(t * (standard_error / unit_) / (p * (1.0 - p)));
    return {unit_ * (odds / (odds + factor)), unit_ * (odds / (odds + 1.0 / factor)), true, true};
  }

  /// The same answer in another unit, factor > 0: a density is a probability over a width.
  [[nodiscard]] estimate scaled(double factor) const noexcept {
    estimate e = *this;
    e.value *= factor;
    e.standard_error *= factor;
    e.unit_ *= factor;
    return e;
  }

  /// From few groups: the same quantity in a draw from their sample, which adds an independent error of its own, carried by
  /// so many terms. Degrees of freedom stay; the verdict falls where what the draw added rests on too few terms.
  [[nodiscard]] estimate drawn_again(double its_value, double added_variance, double added_carriers, error_scale scale) const {
    estimate e = *this;
    e.value = its_value;
    e.scale_ = scale;
    double const own = standard_error * standard_error, total = own + added_variance;
    e.standard_error = std::sqrt(total);
    if (!(total > 0.0) || !(added_variance > 0.0)) return e;
    double const kept = own / total, added = added_variance / total;
    double const of_added = added_carriers > 0.0 ? added * added / added_carriers : 1.0;
    e.carriers = 1.0 / ((carriers > 0.0 ? kept * kept / carriers : 0.0) + of_added);
    if (of_added > 1.0 / 30.0) e.lower_verdict(of_added > 1.0 / 5.0 ? steelyard::verdict::broken : steelyard::verdict::strained);
    return e;
  }

  /// Number of independent groups where they are few, and give the degrees of freedom; else 0.
  [[nodiscard]] double groups() const noexcept { return groups_; }

  static constexpr double few_groups = 64.0;

 protected:
  /// The worse of the verdict so far and this one.
  void lower_verdict(steelyard::verdict worst) noexcept {
    if (static_cast<int>(worst) > static_cast<int>(verdict_)) verdict_ = worst;
  }

 private:
  enum class side { both, never, always };

  [[nodiscard]] double one_sided_limit(double level) const noexcept {
    double const log_miss = detail::portable_log1p(-level);
    double const by_weight = -detail::portable_expm1(largest_unit_ * log_miss);
    if (bound_size_ == 0.0) return by_weight;
    double const by_bound = -detail::portable_expm1(log_miss / bound_size_) * bound_factor_;
    return by_bound < 1.0 ? by_bound : 1.0;
  }

  steelyard::verdict verdict_ = steelyard::verdict::broken;
  error_scale scale_ = error_scale::linear;
  side sided_ = side::both;
  double unit_ = 1.0;
  double groups_ = 0.0;
  double largest_unit_ = 0.0;
  double bound_factor_ = 0.0;
  double bound_size_ = 0.0;
};

/// "0.30786 +- 0.00044": value and standard error, to two digits of the error, in another unit where a factor is given
/// (100 for percent).
[[nodiscard]] inline std::string figures(estimate const& e, double factor = 1.0) {
  return detail::rounded_to_error(e.value * factor, e.standard_error * factor);
}

/// One sentence: value and standard error to two digits of it, then the verdict.
[[nodiscard]] inline std::string to_string(estimate const& e) {
  if (e.never_seen() || e.always_seen()) {
    interval const limits = e.error_interval(0.95);
    return e.never_seen() ? "never seen; at most " + detail::short_number(limits.upper) + " at level 0.95 (broken)"
                          : "always seen; at least 1 - " + detail::short_number(1.0 - limits.lower) +
                                " at level 0.95 (broken)";
  }
  return detail::rounded_to_error(e.value, e.standard_error) + " (" + std::string(to_string(e.verdict())) +
         (e.groups() > 0.0 ? ", from " + detail::short_number(e.groups()) + " groups)"
                           : ", carried by " + detail::short_number(e.carriers) + " terms)");
}

template <class Char, class Traits>
std::basic_ostream<Char, Traits>& operator<<(std::basic_ostream<Char, Traits>& out, estimate const& e) {
  return out << to_string(e).c_str();
}

}  // namespace steelyard::inline v1
