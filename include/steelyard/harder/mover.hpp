// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <cstdint>
#include <span>
#include <tuple>
#include <type_traits>
#include <utility>
#include <vector>

#include <steelyard/base/elementary.hpp>
#include <steelyard/harder/population.hpp>
#include <steelyard/harder/rung_settings.hpp>
#include <steelyard/harder/word_player.hpp>

namespace steelyard::inline v1::detail {

/// Where a chain is on the ladder, and what is to be kept of it.
struct chain_task {
  std::uint64_t seed = 1, chain = 0, rung = 0;
  bool last = false;         ///< scores are kept,
  bool keep_states = false;  ///< and states too
};

/// Counter word 3 of the stream for step `step` on rung `rung`; words read past the record come from another stream.
inline constexpr std::uint64_t step_round(std::uint64_t rung, std::uint64_t step) noexcept { return rung + (step << 24); }
inline constexpr std::uint64_t past_record = std::uint64_t{1} << 63;

/// Moves chains: a worker with its own instances of the user's functions and room to work in.
template <class Player, class... Moves>
class mover {
 public:
  using player_type = Player;
  using state = typename Player::state;
  static constexpr bool looks_at_states = (is_exact_draw<Moves> || ...);

  template <class... Parts>
  mover(char const* run, std::tuple<Moves...> const& own, Parts const&... parts)
      : player_(parts...), run_(run), own_(own), source_(0) {}

  [[nodiscard]] Player& player() noexcept { return player_; }

  /// The first state of a chain on a rung: its start, which is played again only where someone looks at it.
  void begin(trail<state>& chain, chain_task const& task) {
    chain.at.find_deviates();
    chain.arrive();
    if (task.last || looks_at_states) look(chain, chain.visits.back(), task);
  }

  /// Plays a state again and keeps what a last rung keeps.
  void look(trail<state>& chain, visit const& v, chain_task const& task) {
    auto const words = chain.words_of(v);
    next_.words.assign(words.begin(), words.end());
    player_.play(next_.words, seat(task, 0), site(task),
                 [&](auto&& x, mark const&, std::span<double const> scores) { keep(chain, task, std::forward<decltype(x)>(x), scores); });
  }

  /// States first + 1, ..., last of a chain.
  void walk(trail<state>& chain, chain_task const& task, std::uint64_t first, std::uint64_t last, rung_settings const& how,
            std::vector<arm_tally>& tallies) {
    for (std::uint64_t step = first; step < last; ++step)
      if (take_step(chain, task, step, how, tallies))
        chain.arrive();
      else
        chain.stay();
  }

 private:
  [[nodiscard]] word_seat seat(chain_task const& task, std::uint64_t step) const noexcept {
    return {task.seed, task.chain, purpose::move, step_round(task.rung, step) | past_record};
  }
  [[nodiscard]] call_site site(chain_task const& task) const noexcept { return {run_, task.chain, task.rung}; }

  /// One proposal; true where the chain went there.
  bool take_step(trail<state>& chain, chain_task const& task, std::uint64_t step, rung_settings const& how, std::vector<arm_tally>& tallies) {
    draws_access::seat(source_, task.seed, task.chain, purpose::move, step_round(task.rung, step));
    std::size_t const of = how.class_of(chain.at.used);
    word_class const& cls = how.classes[of];
    normal_fit const& fit = cls.fits[chain.lineage & 1u];
    std::size_t const which = choose(cls.uses, source_.uniform());
    arm const& by = how.arms[which];
    if (!propose_by(by, chain, cls, fit, task, how)) return false;
    arm_tally& tally = tallies[of * how.arms.size() + which];
    tally.tries += 1.0;
    double const now = how.target.log_density(chain.here), u = source_.uniform();
    bool moved = false;
    player_.play(next_.words, seat(task, step), site(task), [&](auto&& x, mark const& seen, std::span<double const> scores) {
      double const then = how.target.log_density(seen);
      if (!(then > impossible)) return;
      double chance = then - now + next_.log_ratio;
      if (std::size_t const other = how.class_of(next_.words.size()); other != of) {
        if (by.kind == move_kind::fitted || by.kind == move_kind::mixture || !(how.classes[other].uses[which].share > 0.0)) return;  // no way back
        chance += portable_log(how.classes[other].uses[which].share / cls.uses[which].share);
      }
      double const accept = chance >= 0.0 || by.kind == move_kind::exact ? 1.0 : portable_exp(chance);
      tally.accepted += accept;
      if (!(u < accept)) return;
      moved = true;
      double const climbed = how.ahead.weight(seen) - how.ahead.weight(chain.here);
      tally.way += climbed * climbed / how.way_unit + settle(chain.at, fit, by.kind == move_kind::fitted);
      chain.here = seen;
      keep(chain, task, std::forward<decltype(x)>(x), scores);
    });
    if (!moved && by.kind == move_kind::exact)
      throw located{task.chain, std::make_exception_ptr(bad_argument(
                                    std::string(run_) + ": the exact draw of words " + std::to_string(by.first) + " to " +
                                    std::to_string(by.last - 1) + " led to an impossible state in " + site(task).text() +
                                    "; it must follow the block's distribution given the reading and everything else"))};
    return moved;
  }

  /// Fills the proposal; false where nothing that the state used is changed, so that no call is needed.
  bool propose_by(arm const& by, trail<state>& chain, word_class const& cls, normal_fit const& fit, chain_task const& task,
                  rung_settings const& how) {
    if (by.kind == move_kind::fitted || by.kind == move_kind::mixture) {
      while (chain.at.words.size() < fit.size()) {  // words that the state did not use are free
        chain.at.words.push_back(source_());
        chain.at.deviates.push_back(normal_from_word(chain.at.words.back()));
      }
      if (by.kind == move_kind::fitted)
        propose_fitted(cls.scale, chain.at, fit, source_, next_);
      else
        propose_mixture(chain.at, cls.mixtures[chain.lineage & 1u], source_, next_);
    } else if (by.kind == move_kind::exact) {
      return draw_exactly(by, chain, task, how.target.power, std::index_sequence_for<Moves...>{});
    } else {
      propose(by, chain.at, how.reach, source_, next_);
    }
    return !next_.changed.empty();
  }

  template <std::size_t... I>
  bool draw_exactly(arm const& by, trail<state>& chain, chain_task const& task, double power, std::index_sequence<I...>) {
    if (chain.at.used < by.last) return false;
    next_.words = chain.at.words;
    next_.deviates.clear();
    next_.log_ratio = 0.0;
    next_.changed.clear();
    for (std::size_t i = by.first; i < by.last; ++i) next_.changed.push_back(static_cast<std::uint32_t>(i));
    [[maybe_unused]] auto const one = [&](auto const& move) {
      if constexpr (is_exact_draw<std::remove_cvref_t<decltype(move)>>) {
        block_words block(std::span<std::uint64_t>(next_.words).subspan(by.first, by.last - by.first));
        state const& now = task.last && task.keep_states ? chain.states.data()[chain.states.size() - 1] : *chain.state;
        try {
          move.draw(now, power, source_, block);
        } catch (...) {
          throw_from_call("an exact draw", site(task));
        }
      }
    };
    ((I == by.own ? one(std::get<I>(own_)) : void()), ...);
    return true;
  }

  template <class Drawn>
  void keep(trail<state>& chain, chain_task const& task, Drawn&& x, std::span<double const> scores) {
    if (task.last) chain.scores.insert(chain.scores.end(), scores.begin(), scores.end());
    if (task.last && task.keep_states)
      chain.states.emplace_back(std::forward<Drawn>(x));
    else if (looks_at_states)
      chain.state.emplace(std::forward<Drawn>(x));
  }

  static std::size_t choose(std::vector<arm_use> const& uses, double u) noexcept {
    std::size_t i = 0;
    for (double sum = uses[0].share; i + 1 < uses.size() && u >= sum; sum += uses[++i].share) {
    }
    while (i > 0 && uses[i].share == 0.0) --i;
    return i;
  }

  /// Makes the proposal the chain's place; returns the squared way over the fitted words, each in units of its variance.
  double settle(chain_place& at, normal_fit const& fit, bool fitted) {
    std::size_t const size = next_.words.size(), k = fit.size(), before = at.deviates.size();
    double way = 0.0;
    at.deviates.resize(size);
    for (std::size_t j = 0; j < next_.changed.size(); ++j) {
      std::size_t const i = next_.changed[j];
      if (i >= size) break;
      double const z = next_.deviates.empty() ? normal_from_word(next_.words[i]) : next_.deviates[j];
      if (i < k && i < before) {
        double const d = (z - at.deviates[i]) / fit.deviation(i);
        way += d * d;
      }
      at.deviates[i] = z;
    }
    for (std::size_t i = before; i < size; ++i) at.deviates[i] = normal_from_word(next_.words[i]);
    std::swap(at.words, next_.words);
    at.used = size;
    at.standard_known = fitted && size >= k;
    if (at.standard_known) {
      std::swap(at.standard, next_.standard);
      at.standard_squares = next_.standard_squares;
    }
    return k > 0 ? way / static_cast<double>(k) : 0.0;
  }

  Player player_;
  char const* run_;
  std::tuple<Moves...> const& own_;
  draws source_;
  proposal next_;
};

}  // namespace steelyard::inline v1::detail
