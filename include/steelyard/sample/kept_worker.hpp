// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <cstdint>
#include <memory>
#include <span>
#include <string>
#include <tuple>
#include <utility>
#include <vector>

#include <steelyard/base/kernels.hpp>
#include <steelyard/estimate/reader.hpp>
#include <steelyard/estimate/user_code.hpp>
#include <steelyard/sample/origin.hpp>
#include <steelyard/sample/state_store.hpp>

namespace steelyard::inline v1::detail {

/// Log-weights of a weighted sample and where they came from.
struct sample_columns {
  std::vector<double> log_weights;           ///< b + the sum of the scores; `impossible` where any is
  std::vector<double> base;                  ///< b; empty: all zero
  double base_maximum = 0.0;                 ///< largest b
  double log_base = 0.0;                     ///< log-evidence accounted for before
  bool base_known = false;                   ///< after tempering: e^b averages to e^-log_base by construction
  std::vector<std::string> names;            ///< of the likelihood columns
  std::vector<std::vector<double>> scores;   ///< a column each; empty where the one column is `log_weights` itself
  bool given = false;                        ///< an event is given: failed runs are in none, and count no more
  bool bound_known = false;
  double log_bound = 0.0;

  [[nodiscard]] std::span<double const> column(std::size_t k) const noexcept {
    return scores.empty() ? std::span<double const>(log_weights) : std::span<double const>(scores[k]);
  }
};

/// Fills blocks from a weighted sample: states in memory, or made again.
template <class X, class... Es>
class kept_worker {
 public:
  kept_worker(state_store<X> const& states, sample_columns const& columns, sample_origin const& origin,
              std::tuple<Es...> const& estimators)
      : states_(states), columns_(columns), origin_(origin), read_(estimators) {}

  void fill(std::uint64_t index, block& b) {
    b.clear(index * block_size, origin_.counts.empty() ? 0 : origin_.copies_before[static_cast<std::size_t>(index)]);
    auto const [from, to] = origin_.range_of(index, columns_.log_weights.size());
    X const* const kept = states_.data();
    positions_.clear();
    for (std::size_t i = from; i < to; ++i) {
      std::uint64_t const sample = origin_.sample_of(i);
      if (b.push(sample, columns_.log_weights[i]) && reads) {
        if (kept != nullptr)
          call_user("a readout", sample, [&] { read_.read(kept[i], b.row(), b.stride()); });
        else
          positions_.push_back(i);
      }
      if (!origin_.counts.empty()) b.push_count(origin_.counts[i]);
      if (!origin_.groups.empty()) b.push_group(origin_.groups[i]);
    }
    if (!positions_.empty()) {
      double* row = b.first_row();
      states_.visit(positions_, [&](std::size_t i, X const& state) {
        call_user("a readout", origin_.sample_of(i), [&] { read_.read(state, row++, b.stride()); });
      });
    }
    if (!columns_.base.empty() && !columns_.base_known && to > from) {
      std::span<double> const out = b.base(to - from);
      weights_from_logs(std::span<double const>(columns_.base).subspan(from, to - from), columns_.base_maximum, out);
    }
    b.close(origin_.how, sizeof...(Es) == 0);  // the sample knows its largest weights once it is made
  }

 private:
  static constexpr bool reads = reader<X, Es...>::columns > 0;

  state_store<X> const& states_;
  sample_columns const& columns_;
  sample_origin const& origin_;
  reader<X, Es...> read_;
  std::vector<std::size_t> positions_;
};

}  // namespace steelyard::inline v1::detail
