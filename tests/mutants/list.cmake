# SPDX-License-Identifier: BSL-1.0
# Faults that the tests must notice, one call each:
#   mutant(name  file under include/steelyard  test under tests  what it breaks  text  replacement)
# A name that begins with quick_ is tried in every run of the tests, the others with tests/run --honest.

# --- estimators -------------------------------------------------------------------------------------------------------
mutant(last_bin_open estimate/bins.hpp unit/law_edges.cpp
  "the last bin of a histogram is open on the right"
  [==[return x == e.back() ? n - 1 : n + 1;]==]
  [==[return n + 1;]==])
mutant(quick_bin_edge_shifted estimate/bins.hpp unit/law_edges.cpp
  "a value on an edge falls into the bin below it"
  [==[std::upper_bound(e.begin(), e.end(), x)]==]
  [==[std::lower_bound(e.begin() + 1, e.end(), x)]==])
mutant(missing_square estimate/mean_sums.hpp unit/proof_self_check.cpp
  "a factor on the weights is not squared in the error sums"
  [==[double const square = factor * factor, fourth = square * square;]==]
  [==[double const square = factor, fourth = square * square;]==])
mutant(weights_not_normalised estimate/mean_sums.hpp unit/proof_self_check.cpp
  "the error of a mean is not divided by the sum of the weights"
  [==[terms.sum_squares = second_2_[pair(k, k)] * square;]==]
  [==[terms.sum_squares = second_2_[pair(k, k)] * scale;]==])
mutant(merge_without_shift estimate/mean_sums.hpp unit/proof_self_check.cpp
  "merging leaves out the gap between the means"
  [==[+ shift[k] * shift[j] * second_;]==]
  [==[;]==])
mutant(no_rescale_to_maximum estimate/accumulation.hpp unit/law_transform.cpp
  "sums are not brought to the larger maximum before they are joined"
  [==[std::apply([&](auto&... each) { (each.rescale(factor), ...); }, slots);]==]
  [==[]==])
mutant(counts_ignored estimate/run_facts.hpp unit/law_counts.cpp
  "a state that counts m times counts once"
  [==[return counts.empty() ? 1.0 : static_cast<double>(counts[i]);]==]
  [==[return 1.0;]==])
mutant(quick_never_seen_is_certain estimate/share_sums.hpp unit/law_verdict.cpp
  "an event that no sample met has standard error 0 and no limit"
  [==[if (!seen) return estimate::one_sided(false, facts);]==]
  [==[if (!seen) return estimate(0.0, terms, facts);]==])
mutant(linear_scale estimate/share_sums.hpp unit/law_verdict.cpp
  "limits of a probability are symmetric on the plain scale"
  [==[return estimate(in / (in + out), terms, facts, error_scale::logit);]==]
  [==[return estimate(in / (in + out), terms, facts);]==])
mutant(quick_kish_as_verdict estimate/estimate.hpp unit/law_verdict.cpp
  "the sample-wide effective size decides on a readout's error bar"
  [==[bool const good = carriers >= 30.0 && effective_size >= 50.0;]==]
  [==[carriers = effective_size; bool const good = effective_size >= 50.0;]==])
mutant(degrees_of_freedom estimate/estimate.hpp unit/law_verdict.cpp
  "degrees of freedom are too many by one"
  [==[degrees_of_freedom = carriers > 1.0 ? carriers - 1.0 : 0.0;]==]
  [==[degrees_of_freedom = carriers;]==])
mutant(woodruff_clipped estimate/quantile_result.hpp unit/law_verdict.cpp
  "limits of a quantile are clipped at the sample's own end"
  [==[if (!(target > 0.0 && target < 1.0)) return false;]==]
  [==[if (!(target > 0.0 && target < 1.0)) return limit = column_->value(upper ? column_->size() - 1 : 0), true;]==])
mutant(failed_runs_forgotten estimate/log_evidence.hpp unit/run_failures.cpp
  "the evidence divides by the states, not by all runs"
  [==[if (facts.failed > 0)
      all.add(]==]
  [==[if (false)
      all.add(]==])

mutant(weights_of_groups_forgotten estimate/block.hpp unit/sample_weigh.cpp
  "a block does not add its weights to their groups"
  [==[totals_.add_groups(groups_, counts_, weights_);]==]
  [==[]==])

# --- the jackknife ----------------------------------------------------------------------------------------------------
mutant(one_group_too_few estimate/jackknife.hpp unit/law_jackknife.cpp
  "the last group is left out of the jackknife"
  [==[std::size_t const groups = shares.size();]==]
  [==[std::size_t const groups = shares.size() - 1;]==])
mutant(delete_one_factor estimate/jackknife.hpp unit/law_jackknife.cpp
  "groups of different size count alike in the jackknife"
  [==[double const u = (1.0 - shares[g]) * (sum / whole - moved[g]), square = u * u;]==]
  [==[double const u = sum / whole - moved[g], square = u * u;]==])
mutant(group_of_another estimate/jackknife.hpp unit/law_jackknife.cpp
  "samples go to other groups of the jackknife than the documented ones"
  [==[return static_cast<std::size_t>(sample / jackknife_run % jackknife_groups);]==]
  [==[return static_cast<std::size_t>(sample % jackknife_groups);]==])

# --- weights, samples, resampling ---------------------------------------------------------------------------------------
mutant(log_taken_twice weigh/itemised.hpp unit/weigh_scores.cpp
  "the logarithm of a likelihood is taken twice"
  [==[return score.value == 0.0 ? impossible : portable_log(score.value);]==]
  [==[return score.value == 0.0 ? impossible : portable_log(portable_log1p(score.value));]==])
mutant(prior_weights_ignored sample/weigh.hpp unit/sample_weigh.cpp
  "prior weights are taken for ones"
  [==[base.push_back(w > 0.0 ? portable_log(w) : impossible);]==]
  [==[base.push_back(w > 0.0 ? 0.0 : impossible);]==])
mutant(quick_systematic_off_by_one sample/systematic.hpp unit/sample_positions.cpp
  "systematic draws are one step off"
  [==[std::uint64_t sum = one - 1 - static_cast<std::uint64_t>(u * static_cast<double>(one));]==]
  [==[std::uint64_t sum = one + one - 1 - static_cast<std::uint64_t>(u * static_cast<double>(one));]==])
mutant(resampling_error_alone sample/ensemble.hpp unit/sample_resample.cpp
  "a resampled ensemble has the error of independent states alone"
  [==[terms.sum_squares = own + variance;]==]
  [==[terms.sum_squares = variance;]==])
mutant(merge_by_halves run/slots.hpp unit/run_resample.cpp
  "one-pass resampling takes either part as likely, whatever it weighs"
  [==[double const share = total > 0.0 ? right.sum_ / total : 0.0;]==]
  [==[double const share = 0.5;]==])

# --- runs -----------------------------------------------------------------------------------------------------------------
mutant(stops_on_few_carriers estimate/until.hpp unit/run_until.cpp
  "a run stops at a small standard error whatever carries it"
  [==[: e.carriers >= 30.0;]==]
  [==[: true;]==])
mutant(no_spot_check run/run_worker.hpp unit/run_hidden.cpp
  "samples are not looked at again"
  [==[if (maker.look(i) == *before) continue;]==]
  [==[if (true) continue;]==])
mutant(first_to_fail estimate/sweep.hpp unit/run_failures.cpp
  "the failure that comes first in time is reported, not that of the lowest sample"
  [==[if (sample >= lowest_.load()) return;]==]
  [==[if (what_) return;]==])
mutant(streams_renumbered sample/origin.hpp unit/sample_states.cpp
  "after a failed run, the stream of a state is taken to be its position"
  [==[return samples.empty() ? i : samples[i];]==]
  [==[return i;]==])
mutant(zero_weight_read estimate/block.hpp unit/run_failures.cpp
  "readouts are called, and refused where they are NaN, at states of weight zero"
  [==[bool const possible = log_weight > impossible;]==]
  [==[bool const possible = true;]==])

# --- the test kit -----------------------------------------------------------------------------------------------------
mutant(ties_below proof/pool.hpp unit/proof_calibration.cpp
  "draws equal to the truth count as below it"
  [==[if (values[i] == truth) tied += weights[i];]==]
  [==[if (values[i] == truth) below += weights[i];]==])
mutant(envelope_pointwise proof/chances.hpp unit/proof_chances.cpp
  "the envelope has its rate at each point, not in all"
  [==[if (leaving_probability(n, points, tried) <= rate) {]==]
  [==[if (true) {]==])
mutant(truth_outside_pool proof/pool.hpp unit/proof_calibration.cpp
  "the truth is not among the draws it is compared with"
  [==[double below = 0.0, tied = weights.back(), total = weights.back();]==]
  [==[double below = 0.0, tied = 0.0, total = 1e-300;]==])
