// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <atomic>
#include <cstddef>
#include <cstdint>
#include <memory>
#include <optional>
#include <span>
#include <utility>

#include <steelyard/base/executor.hpp>
#include <steelyard/base/functional.hpp>
#include <steelyard/run/maker.hpp>
#include <steelyard/sample/origin.hpp>
#include <steelyard/sample/state_store.hpp>

namespace steelyard::inline v1::detail {

/// States made again from their streams whenever they are looked at.
template <class Sampler>
class replay_store final : public state_store<state_of_t<Sampler>> {
 public:
  using state = state_of_t<Sampler>;

  replay_store(Sampler sampler, run_terms terms, std::shared_ptr<sample_origin const> origin)
      : sampler_(std::move(sampler)), terms_(std::move(terms)), origin_(std::move(origin)), pool_([this] {
          return std::make_unique<player>(sampler_);
        }) {}

  [[nodiscard]] state const* data() const noexcept override { return nullptr; }
  void visit(std::span<std::size_t const> positions, typename state_store<state>::look const& act) const override {
    auto const own = pool_.take();
    for (std::size_t const i : positions) play(*own, origin_->sample_of(i), [&](auto&& x) { act(i, x); });
  }
  void remake(std::span<std::size_t const> positions, std::function<void(state&&)> const& take) const override {
    auto const own = pool_.take();
    for (std::size_t const i : positions)
      play(*own, origin_->sample_of(i), [&](auto&& x) { take(state(std::forward<decltype(x)>(x))); });
  }
  [[nodiscard]] std::uint64_t replays() const noexcept override { return replays_.load(); }

  /// Sample i, whatever position it has.
  template <class Act>
  void play_sample(std::uint64_t i, Act act) const {
    auto const own = pool_.take();
    play(*own, i, act);
  }

 private:
  struct player {
    explicit player(Sampler const& sampler) : call(instance_of<Sampler>::make(sampler)), source(0) {}
    instance_t<Sampler> call;
    draws source;
  };

  template <class Act>
  void play(player& own, std::uint64_t i, Act act) const {
    ++replays_;
    seat_on_sample(own.source, terms_, i);
    auto&& drawn = call_user("the sampler", i, [&]() -> decltype(auto) { return detail::call(own.call, own.source); });
    if constexpr (unwrap_optional<result_t<Sampler, draws&>>::may_be_empty) {
      if (!drawn.has_value())
        throw located{i, std::make_exception_ptr(failed_sample(
                             "the sampler of sample " + std::to_string(i) + " failed: it returned no state", i))};
      act(*std::forward<decltype(drawn)>(drawn));
    } else {
      act(std::forward<decltype(drawn)>(drawn));
    }
  }

  Sampler sampler_;
  run_terms terms_;
  std::shared_ptr<sample_origin const> origin_;
  mutable worker_pool<player> pool_;
  mutable std::atomic<std::uint64_t> replays_{0};
};

}  // namespace steelyard::inline v1::detail
