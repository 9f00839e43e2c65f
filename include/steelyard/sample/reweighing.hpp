// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <cstdint>
#include <span>
#include <string>
#include <string_view>
#include <utility>
#include <vector>

#include <steelyard/base/algorithm.hpp>
#include <steelyard/base/elementary.hpp>
#include <steelyard/base/functional.hpp>
#include <steelyard/base/text.hpp>
#include <steelyard/estimate/user_code.hpp>
#include <steelyard/sample/kept_worker.hpp>
#include <steelyard/sample/origin.hpp>
#include <steelyard/sample/state_store.hpp>
#include <steelyard/weigh/itemised.hpp>

namespace steelyard::inline v1::detail {

inline std::string listed_names(std::vector<std::string> const& names) {
  std::string text;
  for (std::string const& each : names) text += (text.empty() ? "'" : ", '") + each + "'";
  return text.empty() ? "none" : text;
}

/// Column of a reading. @throws bad_name with the names there are.
inline std::size_t find_name(sample_columns const& columns, char const* where, std::string_view name) {
  for (std::size_t k = 0; k < columns.names.size(); ++k)
    if (columns.names[k] == name) return k;
  throw bad_name(std::string(where) + ": there is no reading '" + std::string(name) + "'; this sample has " +
                 listed_names(columns.names));
}

/// Fills `log_weights` from base and scores.
inline void add_up(sample_columns& columns, std::size_t size) {
  columns.log_weights.assign(size, 0.0);
  std::vector<double> row(columns.scores.size());
  for (std::size_t i = 0; i < size; ++i) {
    for (std::size_t k = 0; k < row.size(); ++k) row[k] = columns.scores[k][i];
    columns.log_weights[i] = total_log(columns.base.empty() ? 0.0 : columns.base[i], row);
  }
  if (columns.scores.size() == 1 && columns.base.empty()) columns.scores.clear();
}

inline sample_columns only_base(sample_columns const& from) {
  sample_columns to;
  to.base = from.base;
  to.base_maximum = from.base_maximum;
  to.log_base = from.log_base;
  to.given = from.given;
  to.base_known = from.base_known;
  return to;
}
inline sample_columns without_scores(sample_columns const& from) {
  sample_columns to = only_base(from);
  add_up(to, from.log_weights.size());
  return to;
}
inline sample_columns chosen_readings(sample_columns const& from, std::vector<std::size_t> const& chosen) {
  sample_columns to = only_base(from);
  for (std::size_t const k : chosen) {
    to.names.push_back(from.names[k]);
    std::span<double const> const column = from.column(k);
    to.scores.emplace_back(column.begin(), column.end());
  }
  add_up(to, from.log_weights.size());
  return to;
}
inline sample_columns without_reading(sample_columns const& from, std::string_view name) {
  std::size_t const left = find_name(from, "without", name);
  std::vector<std::size_t> chosen;
  for (std::size_t k = 0; k < from.names.size(); ++k)
    if (k != left) chosen.push_back(k);
  return chosen_readings(from, chosen);
}
inline sample_columns only_reading(sample_columns const& from, std::string_view name) {
  return chosen_readings(from, {find_name(from, "only", name)});
}
/// Base weights become zero where `held` is 0.
inline sample_columns given_event(sample_columns const& from, std::span<double const> held) {
  sample_columns to = from;
  if (to.scores.empty() && !to.names.empty()) to.scores.push_back(from.log_weights);
  if (to.base.empty()) to.base.assign(held.size(), 0.0);
  if (to.base_known) to.log_base = 0.0;  // the event's own prior probability is not known: it is summed
  to.base_known = false;
  to.given = true;
  to.base_maximum = impossible;
  for (std::size_t i = 0; i < held.size(); ++i) {
    if (held[i] == 0.0) to.base[i] = to.log_weights[i] = impossible;
    to.base_maximum = std::max(to.base_maximum, to.base[i]);
  }
  if (!(to.base_maximum > impossible)) to.base_maximum = 0.0;
  return to;
}

/// Calls act(worker's own copy of `f`, position, state) for the states of each block, block by block on the executor.
template <class X, class F, class Wanted, class Act>
void for_each_state(state_store<X> const& states, sample_origin const& origin, std::size_t size, F const& f,
                    Wanted wanted, Act act) {
  std::uint64_t const blocks = origin.blocks(size);
  std::vector<stretch> const tasks = stretches(0, blocks, longest_stretch);
  first_failure failure;
  origin.execute(tasks.size(), [&](std::size_t t) {
    std::uint64_t const first = tasks[t].first, last = first + (std::uint64_t{1} << tasks[t].level);
    failure.guard(first * block_size, [&] {
      instance_t<F> own = instance_of<F>::make(f);
      std::vector<std::size_t> positions;
      std::size_t const from = origin.range_of(first, size).first, to = origin.range_of(last - 1, size).second;
      for (std::size_t i = from; i < to; ++i)
        if (wanted(i)) positions.push_back(i);
      auto const look = [&](std::size_t i, X const& state) { act(own, i, state); };
      if (X const* const kept = states.data())
        for (std::size_t const i : positions) look(i, kept[i]);
      else
        states.visit(positions, look);
    });
  });
  failure.rethrow();
}

/// Scores of every state whose base weight is positive, under a new weighter.
template <class X, class Weighter>
sample_columns score_states(state_store<X> const& states, sample_columns const& from, sample_origin const& origin,
                            Weighter const& weighter) {
  constexpr std::size_t items = item_count<Weighter>();
  std::size_t const size = from.log_weights.size();
  sample_columns to = only_base(from);
  for (std::size_t k = 0; k < items; ++k) to.names.push_back(item_name(weighter, k));
  to.scores.assign(items, std::vector<double>(size, impossible));
  if constexpr (bounded_weighter<Weighter>) {
    to.bound_known = from.base.empty();
    to.log_bound = weighter.log_bound();
  }
  for_each_state(
      states, origin, size, weighter, [&](std::size_t i) { return to.base.empty() || to.base[i] > impossible; },
      [&](auto const& own, std::size_t i, X const& state) {
        call_user("the weighter", origin.sample_of(i), [&] {
          double row[items];
          score_items(own, state, std::span<double>(row));
          total_log(to.base.empty() ? 0.0 : to.base[i], row);
          for (std::size_t k = 0; k < items; ++k) to.scores[k][i] = row[k];
        });
      });
  add_up(to, size);
  return to;
}

/// A scalar readout at the states of positive weight, or at all of them; 0 elsewhere.
template <class X, class Readout>
std::vector<double> read_states(state_store<X> const& states, sample_columns const& columns, sample_origin const& origin,
                                Readout const& readout, bool everywhere) {
  std::vector<double> values(columns.log_weights.size(), 0.0);
  for_each_state(
      states, origin, values.size(), readout,
      [&](std::size_t i) { return everywhere || columns.log_weights[i] > impossible; },
      [&](auto const& own, std::size_t i, X const& state) {
        call_user("a readout", origin.sample_of(i), [&] { values[i] = static_cast<double>(detail::call(own, state)); });
      });
  return values;
}

/// What was drawn, the largest log-likelihood seen, and what to do.
inline std::string no_likelihood_text(char const* where, sample_columns const& columns, sample_origin const& origin) {
  std::string seen;
  for (std::size_t k = 0; k < columns.names.size(); ++k) {
    double largest = impossible;
    for (double const score : columns.column(k)) largest = std::max(largest, score);
    seen += (seen.empty() ? "" : ", ") + std::string("'") + columns.names[k] + "' " +
            (largest > impossible ? plain_number(largest) : "minus infinity");
  }
  return std::string(where) + ": none of the " + std::to_string(origin.drawn) +
         " samples drawn can be weighed above zero: each is impossible under the readings or the base weights" +
         (origin.failed > 0 ? " (" + std::to_string(origin.failed) + " runs failed)" : "") +
         (seen.empty() ? "" : "; largest log-likelihood seen: " + seen) +
         "; check the likelihood, draw from a wider prior, or use a tempered run";
}

/// Where the weights carry little and there are several readings: the one that
/// alone leaves least of the effective size, in a sentence.
inline std::vector<finding> sharpest_reading(sample_columns const& columns, double effective_size) {
  std::vector<finding> findings;
  if (effective_size >= 50.0 || columns.names.size() < 2) return findings;
  std::vector<double> weights(columns.log_weights.size());
  double least = 0.0;
  std::size_t which = columns.names.size();
  for (std::size_t k = 0; k < columns.names.size(); ++k) {
    std::span<double const> const logs = columns.column(k);
    auto const sums = weights_from_logs(logs, block_maximum(logs), weights);
    double const alone = sums.sum_squares > 0.0 ? sums.sum * (sums.sum / sums.sum_squares) : 0.0;
    if (which < columns.names.size() && alone >= least) continue;
    least = alone;
    which = k;
  }
  findings.push_back({finding_kind::few_effective,
                      "Reading '" + columns.names[which] + "' is the sharpest: weighed by it alone, the states are worth " +
                          (least < 1.5 ? "no more than one" : "only " + short_number(least) + " equal ones") +
                          ". Check its value, its unit and its error before drawing more."});
  return findings;
}

}  // namespace steelyard::inline v1::detail
