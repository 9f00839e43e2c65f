// SPDX-License-Identifier: BSL-1.0
#include <doctest/doctest.h>

#include <steelyard/core.hpp>
#include <steelyard/proof/self_check.hpp>

#include <array>
#include <cmath>
#include <cstddef>
#include <span>
#include <string>
#include <tuple>
#include <vector>

namespace sy = steelyard;
using sy::proof::outcome;
using sy::proof::self_check;

namespace {

/// What an own estimator may get wrong, one at a time.
enum class fault {
  none,
  forgets_shift,    ///< merging adds second moments without the gap between the means
  merges_nothing,   ///< merging keeps the left part alone
  rescales_half,    ///< rescaling forgets one sum
  squares_weights,  ///< weights are taken to have a scale of their own
  hides_a_field,    ///< fields() leaves one out
  counts_entries,   ///< an entry counts as one, whatever its weight
  keeps_old,        ///< fresh() hands on what was accumulated
  divides_by_zero,  ///< weights of zero make NaN
  first_matters,    ///< the first value is taken for the whole
  answers_nan,
};

/// Weighted variance, right or wrong.
template <fault F>
class spread {
 public:
  [[nodiscard]] auto readout() const {
    return [](double x) { return x; };
  }
  [[nodiscard]] spread fresh() const { return F == fault::keeps_old ? *this : spread(); }
  void add(std::span<double const> values, std::span<double const> weights) {
    for (std::size_t i = 0; i < weights.size(); ++i) {
      double const w = F == fault::counts_entries    ? 1.0
                       : F == fault::squares_weights ? weights[i] * (1.0 + weights[i])
                                                     : weights[i];
      if (F == fault::first_matters && weight_ == 0.0) first_ = values[i];
      take(w, values[i], 0.0);
    }
  }
  void rescale(double factor) {
    if (F != fault::rescales_half) weight_ *= factor;
    second_ *= factor;
  }
  spread& operator+=(spread const& other) {
    if (F == fault::merges_nothing) return *this;
    if (F == fault::first_matters && weight_ == 0.0) first_ = other.first_;
    take(other.weight_, other.mean_, other.second_);
    return *this;
  }
  [[nodiscard]] double value() const {
    if (F == fault::answers_nan) return std::nan("");
    return second_ / weight_ + (F == fault::first_matters ? first_ : 0.0);
  }
  template <class Self>
  static auto fields(Self& self) {
    if constexpr (F == fault::hides_a_field)
      return std::tie(self.weight_, self.second_);
    else
      return std::tie(self.weight_, self.mean_, self.second_, self.first_);
  }

 private:
  void take(double weight, double mean, double second) {
    double const total = weight_ + weight;
    if (F != fault::divides_by_zero && !(total > 0.0)) return;
    double const gap = mean - mean_;
    second_ += second + (F == fault::forgets_shift && second > 0.0 ? 0.0 : gap * gap * weight_ * (weight / total));
    mean_ += gap * (weight / total);
    weight_ = total;
  }
  double weight_ = 0.0, mean_ = 0.0, second_ = 0.0, first_ = 0.0;
};

template <fault F>
std::string law_broken_by() {
  sy::proof::check const c = self_check(spread<F>());
  CHECK(c.result() == outcome::failed);
  return c.sentence();
}
bool begins(std::string const& text, char const* words) {
  INFO(text);
  CHECK(text.find(words) == 0);
  return text.find(words) == 0;
}

/// An answer of a type of its own, which says what its numbers are.
struct pair_answer {
  double first, second;
};
void numbers_of(pair_answer const& a, std::vector<double>& out) {
  out.push_back(a.first);
  out.push_back(a.second);
}
class two_sums {
 public:
  static constexpr bool own_error = true;
  [[nodiscard]] auto readout() const {
    return std::tuple([](double x) { return x; }, [](double x) { return x * x; });
  }
  [[nodiscard]] two_sums fresh() const { return {}; }
  void add(std::span<double const> values, std::span<double const> weights, sy::weighted_view const&) {
    std::size_t const n = weights.size();
    for (std::size_t i = 0; i < n; ++i) {
      sums_[0] += weights[i];
      sums_[1] += weights[i] * values[i];
      sums_[2] += weights[i] * values[n + i];
    }
  }
  void rescale(double factor) {
    for (double& each : sums_) each *= factor;
  }
  two_sums& operator+=(two_sums const& other) {
    for (std::size_t k = 0; k < 3; ++k) sums_[k] += other.sums_[k];
    return *this;
  }
  [[nodiscard]] pair_answer answer(sy::run_facts const&) const { return {sums_[1] / sums_[0], sums_[2] / sums_[0]}; }
  template <class Self>
  static auto fields(Self& self) {
    return std::tie(self.sums_);
  }

 private:
  std::array<double, 3> sums_{};
};

}  // namespace

TEST_CASE("a right estimator passes, and each slip is found by the law it breaks") {
  CHECK(self_check(spread<fault::none>()));
  CHECK(begins(law_broken_by<fault::forgets_shift>(), "parts merged"));
  CHECK(begins(law_broken_by<fault::merges_nothing>(), "parts merged"));
  CHECK(begins(law_broken_by<fault::rescales_half>(), "rescale(1/8)"));
  CHECK(begins(law_broken_by<fault::squares_weights>(), "rescale(1/8)"));
  CHECK(begins(law_broken_by<fault::hides_a_field>(), "adding after fields()"));
  CHECK(begins(law_broken_by<fault::counts_entries>(), "a rescaled part"));
  CHECK(begins(law_broken_by<fault::keeps_old>(), "fresh()"));
  CHECK(begins(law_broken_by<fault::divides_by_zero>(), "entries of weight zero, added first"));
  CHECK(begins(law_broken_by<fault::first_matters>(), "parts merged in another order"));
  CHECK(begins(law_broken_by<fault::answers_nan>(), "number 0 of the answer is"));
}

TEST_CASE("the library's own estimators keep the laws") {
  auto const x = [](double v) { return v; };
  auto const square = [](double v) { return v * v; };
  auto const both = [](double v) { return std::array{v, v * v}; };
  auto const event = [](double v) { return v > 0.5; };
  CHECK(self_check<double>(sy::expectation(x)));
  CHECK(self_check<double>(sy::expectation(both)));
  CHECK(self_check<double>(sy::log_evidence()));
  CHECK(self_check<double>(sy::ratio(x, square)));
  CHECK(self_check<double>(sy::difference(x, square)));
  CHECK(self_check<double>(sy::histogram(x, sy::bins({0.1, 0.5, 1.0, 2.0}))));
  CHECK(self_check<double>(sy::quantile(x, 0.3)));
  CHECK(self_check<double>(sy::coverage_interval(x, 0.9)));
  CHECK(self_check<double>(sy::until(sy::expectation(x), 0.1)));
  // an event's column holds 0 and 1
  CHECK(self_check<double>(sy::probability(event), {.value = [](sy::draws& d) { return d.chance(0.3) ? 1.0 : 0.0; }}));
}

TEST_CASE("answers and columns of one's own") {
  CHECK(self_check(two_sums(), {.columns = 2}));
  CHECK(self_check<double>(two_sums()));
}

TEST_CASE("bad input to self_check") {
  CHECK_THROWS_AS(self_check(spread<fault::none>(), {.entries = 23}), sy::bad_argument);
  CHECK_THROWS_AS(self_check(spread<fault::none>(), {.tolerance = 0.0}), sy::bad_argument);
}
