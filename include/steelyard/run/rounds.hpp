// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstdint>
#include <string>
#include <vector>

#include <steelyard/base/algorithm.hpp>
#include <steelyard/base/chrono.hpp>
#include <steelyard/base/error.hpp>
#include <steelyard/base/function_ref.hpp>
#include <steelyard/base/text.hpp>
#include <steelyard/estimate/block.hpp>
#include <steelyard/estimate/diagnosis.hpp>
#include <steelyard/run/plan.hpp>

namespace steelyard::inline v1::detail {

/// Cuts a run into rounds of whole blocks and decides after each whether to go
/// on: progress, time limit and stop token. Rounds never change any bits.
class rounds {
 public:
  using clock = std::chrono::steady_clock;

  /// Blocks [first, last) of a run that draws samples up to `size`.
  /// @throws stopped_early where a stop was asked for already.
  rounds(plan const& how, std::uint64_t first, std::uint64_t size)
      : plan_(how), next_(first), last_((size + block_size - 1) / block_size), size_(size), start_(clock::now()) {
    if (plan_.token.stop_requested())
      throw stopped_early("run: a stop was asked for before the first round; nothing was drawn");
    bool const watched = plan_.progress || plan_.token.stop_possible() || plan_.time_limit.count() > 0 || plan_.checkpoint;
    step_ = watched ? 1 : longest;
  }

  /// Takes blocks in rounds. `take(first, last)` draws them, `failed()` counts runs set aside so far, `save(last,
  /// over)` may leave a checkpoint; `satisfied()` is asked after 1, 2, 4, ... blocks where there are targets.
  void each(function_ref<void(std::uint64_t, std::uint64_t)> take, function_ref<std::uint64_t()> failed,
            function_ref<void(std::uint64_t, bool)> save, bool targets, function_ref<bool()> satisfied) {
    std::uint64_t goal = 1;
    while (targets && goal <= next_) goal *= 2;
    while (next_ < last_) {
      auto const before = clock::now();
      std::uint64_t end = next_ + std::min(step_, last_ - next_);
      if (targets) end = std::min(end, goal);
      take(next_, end);
      next_ = end;
      auto const now = clock::now();
      adapt(now - before);
      if (plan_.progress)
        plan_.progress({drawn(), size_, failed(), std::chrono::duration_cast<std::chrono::nanoseconds>(now - start_)});
      bool const reached = targets && next_ == goal && satisfied();
      if (targets && next_ == goal) goal *= 2;
      bool const stopped = next_ < last_ && plan_.token.stop_requested();
      bool const late = plan_.time_limit.count() > 0 && now - start_ >= plan_.time_limit;
      bool const over = reached || stopped || late || next_ == last_;
      save(next_, over);
      if (reached) return;
      if (next_ == last_) break;
      if (stopped) return stop("a stop was asked for");
      if (late) return stop("the time limit was reached");
    }
    if (targets && !satisfied())
      findings_.push_back({finding_kind::target_missed, "The target for the standard error was not met within " +
                                                            std::to_string(size_) + " samples: give the plan a larger size."});
  }

  [[nodiscard]] std::uint64_t drawn() const noexcept { return std::min(size_, next_ * block_size); }
  [[nodiscard]] std::vector<finding> const& findings() const noexcept { return findings_; }

 private:
  static constexpr std::uint64_t longest = 1024;

  /// Watched rounds last about a tenth of a second.
  void adapt(clock::duration took) {
    if (step_ < longest && took < std::chrono::milliseconds(50)) step_ *= 2;
    if (step_ > 1 && took > std::chrono::milliseconds(200)) step_ /= 2;
  }
  void stop(char const* why) {
    findings_.push_back({finding_kind::stopped, "The run ended after " + std::to_string(drawn()) + " of " +
                                                    std::to_string(size_) + " samples because " + why +
                                                    "; a run with that size repeats it."});
    last_ = next_;
  }

  plan const& plan_;
  std::uint64_t next_, last_, size_;
  std::uint64_t step_ = 1;
  clock::time_point start_;
  std::vector<finding> findings_;
};

}  // namespace steelyard::inline v1::detail
