// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <cstdint>
#include <span>
#include <vector>

#include <steelyard/estimate/estimate.hpp>
#include <steelyard/estimate/mean_sums.hpp>
#include <steelyard/sample/resample.hpp>
#include <steelyard/sample/weighted_sample.hpp>

namespace steelyard::inline v1::detail {

/// Weighted mean of numbers that belong to the states in order, with its error
/// as for an expectation; on the logit scale where they are chances.
template <class X>
estimate weighted_mean(weighted_sample<X> const& sample, std::span<double const> values, error_scale scale) {
  std::vector<double> const logs(sample.log_weights().begin(), sample.log_weights().end());
  sample_origin const& origin = *sample.origin();
  run_facts const facts = sample.facts();
  mean_sums<1> sums;
  std::vector<double> f, w;
  std::vector<std::uint64_t> counts;
  std::vector<std::uint32_t> groups;
  for (std::size_t from = 0; from < logs.size(); from += block_size) {
    f.clear();
    w.clear();
    counts.clear();
    groups.clear();
    for (std::size_t i = from; i < logs.size() && i < from + block_size; ++i) {
      if (!(logs[i] > impossible)) continue;
      f.push_back(values[i]);
      w.push_back(portable_exp(logs[i] - facts.maximum));
      if (!origin.counts.empty()) counts.push_back(origin.counts[i]);
      if (!origin.groups.empty()) groups.push_back(origin.groups[i]);
    }
    weighted_view v;
    v.values = f;
    v.weights = w;
    v.counts = counts;
    v.groups = groups;
    v.how = origin.how;
    mean_sums<1> block;
    block.add(v);
    sums += block;
  }
  double const mean = sums.mean()[0];
  bool const on_edge = scale == error_scale::logit && !(mean > 0.0 && mean < 1.0);
  if (on_edge) return estimate::one_sided(mean > 0.5, facts);
  return estimate(mean, sums.terms(0, facts), facts, scale);
}

/// Mean of f under one weighting of some states less its mean under another, with
/// the error that the two share taken into account: u_i = W_i (f_i - mu) - V_i (f_i - nu).
template <class X>
estimate weighting_difference(weighted_sample<X> const& one, weighted_sample<X> const& other, std::span<double const> values) {
  std::vector<double> const w = plain_weights(one), v = plain_weights(other);
  sample_origin const& origin = *one.origin();
  auto const mean_of = [&](std::vector<double> const& weights, double& total) {
    double sum = 0.0;
    total = 0.0;
    for (double const each : weights) total += each;
    for (std::size_t i = 0; i < weights.size(); ++i) sum += weights[i] / total * values[i];
    return sum;
  };
  double w_total = 0.0, v_total = 0.0;
  double const mu = mean_of(w, w_total), nu = mean_of(v, v_total);
  std::vector<double> u(origin.groups.empty() ? 0 : origin.group_shares.size());
  error_terms terms;
  auto const take = [&](double each, double count) {
    double const square = each * each;
    terms.sum_squares += count * square;
    terms.sum_fourth += count * square * square;
    terms.largest_square = square > terms.largest_square ? square : terms.largest_square;
  };
  for (std::size_t i = 0; i < values.size(); ++i) {
    double const each = w[i] / w_total * (values[i] - mu) - v[i] / v_total * (values[i] - nu);
    double const count = origin.counts.empty() ? 1.0 : static_cast<double>(origin.counts[i]);
    if (!origin.groups.empty())
      u[origin.groups[i]] += each;
    else if (count > 0.0)
      take(each / count, count);
  }
  for (double const each : u) take(each, 1.0);
  run_facts const a = one.facts(), b = other.facts();
  return estimate(mu - nu, terms, a.effective_size() <= b.effective_size() ? a : b);
}

}  // namespace steelyard::inline v1::detail
