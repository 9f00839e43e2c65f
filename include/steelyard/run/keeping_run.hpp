// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <cstdint>
#include <memory>
#include <string>
#include <type_traits>
#include <utility>
#include <vector>

#include <steelyard/estimate/sweep.hpp>
#include <steelyard/run/checkpoint.hpp>
#include <steelyard/run/rounds.hpp>
#include <steelyard/run/run_worker.hpp>
#include <steelyard/run/start.hpp>

namespace steelyard::inline v1::detail {

/// A kept part into a checkpoint, and back. States go as bytes, where they are bytes.
template <class X>
void save_part(byte_writer& out, kept_part<X> const& part, bool keep_states) {
  out.put(part.log_weights);
  out.put(static_cast<std::uint64_t>(part.scores.size()));
  for (auto const& column : part.scores) out.put(column);
  out.put(part.samples);
  if constexpr (std::is_trivially_copyable_v<X>)
    if (keep_states) out.put_raw(part.states.data(), part.states.size() * sizeof(X));
}
template <class X>
void load_part(byte_reader& in, kept_part<X>& part, bool keep_states) {
  in.get(part.log_weights);
  part.scores.resize(static_cast<std::size_t>(in.next<std::uint64_t>()));
  for (auto& column : part.scores) in.get(column);
  in.get(part.samples);
  if constexpr (std::is_trivially_copyable_v<X>)
    if (keep_states)
      for (std::size_t i = 0; i < part.samples.size(); ++i) {
        alignas(X) std::byte raw[sizeof(X)];
        in.get_raw(raw, sizeof raw);
        part.states.emplace_back(*reinterpret_cast<X const*>(raw));
      }
}

/// Draws samples from `from` on and appends them to `part`; fills in what `origin` knows of the run.
template <class Sampler, class Weighter, class X = state_of_t<Sampler>>
void keeping_run(Sampler const& draw, Weighter const& weigh_with, plan const& how, std::uint64_t from, sample_origin& origin,
                 kept_part<X>& part) {
  using worker = keeping_worker<Sampler, Weighter>;
  bool const keep_states = how.keep == keeping::states;
  if (how.checkpoint && keep_states && !std::is_trivially_copyable_v<X>)
    throw bad_argument("run: states of this type cannot be written to a checkpoint as bytes; run with keeping::streams");
  run_shared shared;
  shared.terms = terms_of(how);
  shared.size = how.size;
  shared.probed = probed_samples(how.size);
  worker_pool<worker> pool([&] { return std::make_unique<worker>(draw, weigh_with, shared); });
  std::string shape = std::to_string(sizeof(X)) + (keep_states ? "s;" : "n;");
  for (std::size_t k = 0; k < item_count<Weighter>(); ++k) shape += item_name(weigh_with, k) + ";";
  checkpoint_keeper keeper(how, 2, shape);
  std::uint64_t first = from / block_size;
  if (from == 0) first = keeper.take_up(shared, [&](byte_reader& in) { load_part(in, part, keep_states); });
  if (from > 0) check_extension(pool.take()->making(), shared, origin, part.samples, part.log_weights);
  if (how.time_limit.count() == 0 && !how.token.stop_possible())
    part.reserve(static_cast<std::size_t>(how.size.value()), keep_states);
  rounds all(how, first, how.size);
  std::vector<kept_part<X>> parts;  // of one round after another: pages of fresh memory cost more than what is written there
  all.each(
      [&](std::uint64_t begin, std::uint64_t end) {
        std::vector<stretch> const tasks = stretches(begin, end, longest_stretch);
        if (parts.size() < tasks.size()) parts.resize(tasks.size());
        first_failure failure;
        origin.execute(tasks.size(), [&](std::size_t t) {
          failure.guard(tasks[t].first * block_size, [&] {
            auto const own = pool.take();
            std::uint64_t const blocks = std::uint64_t{1} << tasks[t].level;
            parts[t].reserve(static_cast<std::size_t>(std::min(blocks * block_size, how.size.value())), keep_states);
            for (std::uint64_t b = tasks[t].first; b < tasks[t].first + blocks; ++b) {
              if (failure.before(b * block_size)) return;
              own->fill(b, keep_states, from, parts[t]);
            }
          });
        });
        failure.rethrow();
        for (auto& each : parts) part.append(each);
      },
      [&] { return shared.failed; },
      [&](std::uint64_t next, bool over) {
        if (from == 0) keeper.leave(next, over, shared, [&](byte_writer& out) { save_part(out, part, keep_states); });
      },
      false, [] { return true; });
  origin.drawn = all.drawn();
  origin.calls += all.drawn() - std::min(all.drawn(), first * block_size);
  origin.failed = all.drawn() - part.samples.size();
  origin.findings.insert(origin.findings.end(), all.findings().begin(), all.findings().end());
  note_doubts(origin, weigh_with);
  if (from == 0) {
    auto const own = pool.take();
    check_replay(own->making(), shared, origin, !keep_states);
  }
  if (part.samples.empty())
    throw no_likelihood("run: every one of the " + std::to_string(origin.drawn) +
                        " runs of the sampler failed and was set aside; there is nothing to weigh");
}

}  // namespace steelyard::inline v1::detail
