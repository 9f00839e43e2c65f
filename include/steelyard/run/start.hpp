// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <cstdint>
#include <span>
#include <string>

#include <steelyard/base/algorithm.hpp>
#include <steelyard/run/maker.hpp>
#include <steelyard/run/plan.hpp>
#include <steelyard/run/run_worker.hpp>
#include <steelyard/run/threads.hpp>
#include <steelyard/sample/origin.hpp>

namespace steelyard::inline v1::detail {

inline run_terms terms_of(plan const& how) { return {how.seed, how.source, how.on_failure}; }

/// @throws bad_argument for a size of 0, or one the source of words does not allow.
inline void refuse_size(plan const& how) {
  if (how.size == 0u) throw bad_argument("plan: size is 0; at least one sample is needed");
  if (!how.source.allows(how.size))
    throw bad_argument("plan: size " + std::to_string(how.size.value()) + " does not suit the source of words, which allows " +
                       how.source.sizes());
}

/// Notes in `origin` how the plan draws.
inline void start_run(sample_origin& origin, plan const& how) {
  refuse_size(how);
  origin.from_run = true;
  origin.seed = how.seed;
  origin.source = how.source;
  origin.on_failure = how.on_failure;
  origin.execute = how.executor ? how.executor : on_threads(how.threads);
  if (how.source.replicates() > 0) {
    origin.how = how_drawn::replicated;
    origin.group_shares.assign(static_cast<std::size_t>(how.source.replicates()),
                               1.0 / static_cast<double>(how.source.replicates()));
  }
}

/// Replays the probed samples; where states are made again later, a difference is an error.
template <class Maker>
void check_replay(Maker& making, run_shared const& shared, sample_origin& origin, bool must_agree) {
  std::uint64_t differs = 0;
  auto const [calls, agree] = replay_agrees(making, shared, differs);
  origin.calls += calls;
  if (agree) return;
  if (must_agree) throw hidden_state("run: " + hidden_state_text(differs));
  origin.findings.push_back({finding_kind::hidden_state, hidden_state_text(differs)});
}

/// Looks again at a few samples of a run that is to be extended.
/// @throws bad_argument where one differs, unless its run found hidden state itself.
template <class Maker>
void check_extension(Maker& making, run_shared const& shared, sample_origin& origin, std::span<std::uint64_t const> samples,
                     std::span<double const> log_weights) {
  for (finding const& each : origin.findings)
    if (each.kind == finding_kind::hidden_state) return;
  for (std::uint64_t const i : shared.probed) {
    auto const at = std::lower_bound(samples.begin(), samples.end(), i);
    if (at == samples.end() || *at != i) continue;
    ++origin.calls;
    if (making.look(i).bits != opaque_bits(log_weights[static_cast<std::size_t>(at - samples.begin())]))
      throw bad_argument("extend: sample " + std::to_string(i) +
                         " comes out differently under this pipeline; extend a sample with the pipeline that drew it, before "
                         "reweighing");
  }
}

}  // namespace steelyard::inline v1::detail
