// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <memory>
#include <span>
#include <tuple>
#include <utility>
#include <vector>

#include <steelyard/base/bits.hpp>
#include <steelyard/base/error.hpp>
#include <steelyard/base/text.hpp>
#include <steelyard/estimate/column_parts.hpp>
#include <steelyard/estimate/estimator.hpp>
#include <steelyard/estimate/quantile_result.hpp>
#include <steelyard/estimate/whole_columns.hpp>

namespace steelyard::inline v1 {

namespace detail {

/// Takes in the whole of a kept sample: what quantiles and intervals share. `answer_from` spares the copy of it.
template <class Readout>
class column_estimator {
 public:
  static constexpr bool own_error = true;
  static constexpr bool needs_all = true;
  static constexpr std::size_t columns = 1;

  explicit column_estimator(Readout its_readout) : readout_(std::move(its_readout)) {}

  [[nodiscard]] Readout const& readout() const noexcept { return readout_; }

  void add(std::span<double const>, std::span<double const>, weighted_view const& view) { all_.add(view); }
  void rescale(double factor) { all_.rescale(factor); }
  column_estimator& operator+=(column_estimator const& other) {
    all_.add(other.view());
    return *this;
  }
  template <class Self>
  static auto fields(Self& self) {
    return whole_columns::fields(self.all_);
  }

 protected:
  /// What was taken in; it lasts as long as nothing else is.
  [[nodiscard]] weighted_view view() const noexcept { return all_.view(); }
  [[nodiscard]] column_parts parts() const { return all_.lent(); }
  [[nodiscard]] static std::shared_ptr<weighted_column const> column(column_parts parts, run_facts const& facts) {
    return std::make_shared<weighted_column const>(std::move(parts), facts);
  }

 private:
  Readout readout_;
  whole_columns all_;
};

inline double checked_level(char const* where, double level) {
  if (!is_finite(level) || !(level > 0.0 && level < 1.0))
    throw bad_argument(std::string(where) + ": " + plain_number(level) + " is outside (0, 1)");
  return level;
}

}  // namespace detail

/// Quantile of a scalar readout on a kept sample: inf{x : F(x) >= p}.
/// Memory: 17 bytes an entry of positive weight.
template <class Readout>
class quantile_estimator : public detail::column_estimator<Readout> {
 public:
  quantile_estimator(Readout its_readout, double p)
      : detail::column_estimator<Readout>(std::move(its_readout)), p_(detail::checked_level("quantile", p)) {}

  [[nodiscard]] quantile_estimator fresh() const { return {this->readout(), p_}; }
  [[nodiscard]] quantile_result answer(run_facts const& facts) const { return answer_from(this->parts(), facts); }
  [[nodiscard]] quantile_result answer_from(detail::column_parts const& all, run_facts const& facts) const {
    return {this->column(all, facts), p_};
  }

 private:
  double p_;
};

/// The p-quantile of a readout. @throws bad_argument unless 0 < p < 1.
template <class Readout>
[[nodiscard]] auto quantile(Readout readout, double p) {
  return quantile_estimator<Readout>(std::move(readout), p);
}

/// A coverage interval of the quantity itself: both ends are estimates.
struct interval_result {
  quantile_result lower;
  quantile_result upper;

  operator interval() const noexcept { return {lower.value, upper.value, true, true}; }  // NOLINT: implicit on purpose
};

/// Equal-tailed coverage interval on a kept sample: the quantiles at (1 -+ level)/2.
template <class Readout>
class coverage_interval_estimator : public detail::column_estimator<Readout> {
 public:
  coverage_interval_estimator(Readout its_readout, double level)
      : detail::column_estimator<Readout>(std::move(its_readout)), level_(detail::checked_level("coverage_interval", level)) {}

  [[nodiscard]] coverage_interval_estimator fresh() const { return {this->readout(), level_}; }
  [[nodiscard]] interval_result answer(run_facts const& facts) const { return answer_from(this->parts(), facts); }
  [[nodiscard]] interval_result answer_from(detail::column_parts const& all, run_facts const& facts) const {
    auto const column = this->column(all, facts);
    return {quantile_result(column, 0.5 * (1.0 - level_)), quantile_result(column, 0.5 * (1.0 + level_))};
  }

 private:
  double level_;
};

/// Equal-tailed coverage interval of a readout. @throws bad_argument unless 0 < level < 1.
template <class Readout>
[[nodiscard]] auto coverage_interval(Readout readout, double level) {
  return coverage_interval_estimator<Readout>(std::move(readout), level);
}

}  // namespace steelyard::inline v1
