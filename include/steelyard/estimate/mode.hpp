// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <utility>

#include <steelyard/estimate/histogram.hpp>
#include <steelyard/estimate/mode_result.hpp>

namespace steelyard::inline v1 {

/// Mode of a density histogram: the bin where the weighted density of a readout is highest.
template <class Readout>
class mode_estimator : public histogram_estimator<Readout> {
 public:
  explicit mode_estimator(histogram_estimator<Readout> of) : histogram_estimator<Readout>(std::move(of)) {}
  [[nodiscard]] mode_estimator fresh() const { return mode_estimator(histogram_estimator<Readout>::fresh()); }
  mode_estimator& operator+=(mode_estimator const& other) {
    histogram_estimator<Readout>::operator+=(other);
    return *this;
  }
  [[nodiscard]] mode_result answer(run_facts const& facts) const {
    return histogram_estimator<Readout>::answer(facts).mode();
  }
};

/// Mode of a scalar readout over given bins, or over automatic ones.
template <class Readout, class Edges = automatic_bins_t>
[[nodiscard]] auto mode(Readout readout, Edges edges = {}) {
  return mode_estimator<Readout>(histogram(std::move(readout), std::move(edges)));
}

}  // namespace steelyard::inline v1
