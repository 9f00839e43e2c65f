// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <cstdint>
#include <exception>
#include <functional>
#include <new>
#include <span>
#include <string>
#include <utility>
#include <vector>

#include <steelyard/draw/draws.hpp>
#include <steelyard/estimate/sweep.hpp>
#include <steelyard/harder/rung.hpp>
#include <steelyard/sample/origin.hpp>
#include <steelyard/weigh/concepts.hpp>
#include <steelyard/weigh/itemised.hpp>

namespace steelyard::inline v1::detail {

/// Stands for "no margin": every state has margin 0.
struct no_margin {
  template <class State>
  double operator()(State const&) const noexcept {
    return 0.0;
  }
};

/// Where fresh words come from when a sampler reads past the recorded ones.
struct word_seat {
  std::uint64_t seed = 1, stream = 0;
  purpose what = purpose::run;
  std::uint64_t round = 0;
};

/// Whose call it is, for the sentence that reports a failure.
struct call_site {
  char const* run;
  std::uint64_t unit = 0;  ///< draw or chain
  std::uint64_t rung = 0;  ///< 0: a draw from the prior
  [[nodiscard]] std::string text() const {
    return rung == 0 ? "draw " + std::to_string(unit) : "a move of chain " + std::to_string(unit) + " on rung " + std::to_string(rung);
  }
};

/// Turns the exception in flight into one that says where it happened. @pre called from a handler
[[noreturn]] inline void throw_from_call(char const* stage, call_site const& site) {
  std::string const where = std::string(site.run) + ": " + stage + " in " + site.text();
  try {
    throw;
  } catch (located const&) {
    throw;
  } catch (bad_weight const& e) {
    throw located{site.unit, std::make_exception_ptr(bad_weight(where + " is refused: " + e.what() +
                                                                "; allowed is a finite log-likelihood or minus infinity, "
                                                                "or a finite likelihood of zero or more"))};
  } catch (std::exception const& e) {
    try {
      throw failed_sample(where + " failed: " + e.what(), site.unit);
    } catch (...) {
      throw located{site.unit, std::current_exception()};
    }
  } catch (...) {
    try {
      throw failed_sample(where + " failed with an exception that is no std::exception", site.unit);
    } catch (...) {
      throw located{site.unit, std::current_exception()};
    }
  }
}

/// One worker's sampler, weighter and margin: plays a record of words and says what came of it.
template <class Sampler, class Weighter, class Margin>
class word_player {
 public:
  using state = state_of_t<Sampler>;
  static constexpr std::size_t items = item_count<Weighter>();

  word_player(Sampler const& draw, Weighter const& weigh_with, Margin const& margin_of, failures on_failure)
      : sampler_(instance_of<Sampler>::make(draw)), weighter_(instance_of<Weighter>::make(weigh_with)),
        margin_(instance_of<Margin>::make(margin_of)),
        on_failure_(on_failure), draws_(0) {}

  /// Runs the sampler on `record`, which is cut to the words it used, and calls take(state&&, mark, scores).
  /// @returns false where the run failed and is set aside: `take` is not called then.
  template <class Take>
  bool play(std::vector<std::uint64_t>& record, word_seat const& fresh, call_site const& site, Take take) {
    ++calls_;
    draws_access::record(draws_, record, fresh.seed, fresh.stream, fresh.what, fresh.round);
    char const* stage = "the sampler";
    bool made = false;
    try {
      auto&& drawn = std::invoke(sampler_, draws_);
      record.resize(static_cast<std::size_t>(draws_.words_used()));
      if constexpr (unwrap_optional<result_t<Sampler, draws&>>::may_be_empty) {
        if (!drawn.has_value()) {
          if (on_failure_ == failures::set_aside) return ++failed_, false;
          throw located{site.unit, std::make_exception_ptr(failed_sample(
                                       std::string(site.run) + ": the sampler in " + site.text() + " returned no state", site.unit))};
        }
        made = true;
        weigh(*drawn, stage, take);
      } else {
        made = true;
        weigh(drawn, stage, take);
      }
      return true;
    } catch (std::bad_alloc const&) {
      throw_from_call(stage, site);
    } catch (...) {
      if (made || on_failure_ != failures::set_aside) throw_from_call(stage, site);
      ++failed_;
      return false;
    }
  }

  /// Calls of the sampler, and failed ones that were set aside, since the last time this was asked.
  [[nodiscard]] std::pair<std::uint64_t, std::uint64_t> take_calls() noexcept {
    return {std::exchange(calls_, 0), std::exchange(failed_, 0)};
  }

 private:
  template <class Drawn, class Take>
  void weigh(Drawn&& drawn, char const*& stage, Take& take) {
    double row[items];
    stage = "the weighter";
    score_items(weighter_, std::as_const(drawn), std::span<double>(row));
    mark seen{total_log(0.0, row), 0.0};
    if constexpr (!std::is_same_v<Margin, no_margin>) {
      stage = "the margin";
      seen.margin = static_cast<double>(std::invoke(margin_, std::as_const(drawn)));
      if (!is_finite(seen.margin)) throw bad_readout("the margin is " + plain_number(seen.margin) + "; it must be a finite number");
    }
    stage = "keeping the state";
    take(std::forward<Drawn>(drawn), seen, std::span<double const>(row));
  }

  instance_t<Sampler> sampler_;
  instance_t<Weighter> weighter_;
  instance_t<Margin> margin_;
  failures on_failure_;
  draws draws_;
  std::uint64_t calls_ = 0, failed_ = 0;
};

}  // namespace steelyard::inline v1::detail
