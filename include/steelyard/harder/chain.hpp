// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <cstdint>
#include <span>
#include <utility>
#include <vector>

#include <steelyard/base/algorithm.hpp>
#include <steelyard/harder/moves.hpp>
#include <steelyard/harder/rung.hpp>
#include <steelyard/harder/word_player.hpp>
#include <steelyard/sample/state_store.hpp>

namespace steelyard::inline v1::detail {

/// A state that a chain stayed at for some steps.
struct visit {
  mark seen;
  std::uint64_t steps = 0;
  std::size_t first_word = 0;  ///< in the trail's words
  std::size_t words = 0;
};

/// Where a chain has been on one rung. States that a step left are kept once, with how long it stayed.
template <class X>
struct trail {
  std::uint32_t lineage = 0;
  std::vector<visit> visits;
  std::vector<std::uint64_t> words;
  std::vector<double> scores;   ///< a row for each visit, on the last rung
  state_array<X> states;        ///< on the last rung, where states are kept
  chain_place at;
  mark here;

  [[nodiscard]] std::span<std::uint64_t const> words_of(visit const& v) const noexcept {
    return std::span<std::uint64_t const>(words).subspan(v.first_word, v.words);
  }
  /// Begins a stay where the chain is now; its length is counted by `stay`.
  void arrive() {
    visits.push_back({here, 0, words.size(), at.words.size()});
    words.insert(words.end(), at.words.begin(), at.words.end());
  }
  void stay() noexcept { ++visits.back().steps; }
};

/// What all chains of a rung share.
struct rung_settings {
  rung_target target;
  std::vector<arm> arms;
  normal_fit fits[2];       ///< fits[h] for the chains whose lineage has parity h, made from the others
  double way_scale = 1.0;   ///< variance of the log-likelihood, for the squared way of a step
  std::size_t reach = 1;
};

/// Stream of the moves of step `step` on rung `rung`, and that of words drawn past the record.
inline std::uint64_t step_round(std::uint64_t rung, std::uint64_t step) noexcept { return rung + (step << 24); }
inline constexpr std::uint64_t past_record = std::uint64_t{1} << 63;

/// A worker that moves chains: it owns an instance of the user's functions and room to work in.
template <class Player>
class mover {
 public:
  using state = typename Player::state;

  template <class... Parts>
  mover(std::uint64_t seed, char const* run, Parts const&... parts) : player_(parts...), seed_(seed), run_(run), source_(seed) {}

  [[nodiscard]] Player& player() noexcept { return player_; }

  /// Begins a rung at `chain.at`: the deviates are found; on the last rung the state is made again.
  void begin(trail<state>& chain, std::uint64_t unit, std::uint64_t rung, bool last, bool keep_states) {
    chain.at.find_deviates();
    if (last) {
      std::vector<std::uint64_t> words = chain.at.words;
      player_.play(words, {unit, purpose::move, step_round(rung, 0) | past_record}, {run_, unit, rung},
                   [&](auto&& x, mark const&, std::span<double const> scores) {
                     chain.scores.insert(chain.scores.end(), scores.begin(), scores.end());
                     if (keep_states) chain.states.emplace_back(std::forward<decltype(x)>(x));
                   });
    }
    chain.arrive();
  }

  /// Steps first + 1, ..., last of one chain.
  void walk(trail<state>& chain, std::uint64_t unit, std::uint64_t rung, std::uint64_t first, std::uint64_t last,
            rung_settings const& how, bool last_rung, bool keep_states, std::vector<arm_tally>& tallies) {
    normal_fit const& fit = how.fits[chain.lineage & 1u];
    for (std::uint64_t step = first + 1; step <= last; ++step) {
      std::uint64_t const round = step_round(rung, step);
      draws_access::seat(source_, seed_, unit, purpose::move, round);
      std::size_t const which = choose(how.arms, source_.uniform());
      arm const& by = how.arms[which];
      if (by.kind == move_kind::fitted)
        while (chain.at.words.size() < fit.size()) {
          chain.at.words.push_back(source_());
          chain.at.deviates.push_back(normal_from_word(chain.at.words.back()));
        }
      propose(by, chain.at, how.reach, fit, source_, next_);
      arm_tally& tally = tallies[which];
      if (next_.changed.empty()) {  // nothing that the state used was moved
        chain.stay();
        continue;
      }
      tally.tries += 1.0;
      double const now = how.target.log_density(chain.here);
      double const u = source_.uniform();
      bool moved = false;
      player_.play(next_.words, {unit, purpose::move, round | past_record}, {run_, unit, rung},
                   [&](auto&& x, mark const& seen, std::span<double const> scores) {
                     double const then = how.target.log_density(seen);
                     if (!(then > impossible)) return;
                     double const chance = then - now + next_.log_ratio;
                     double const accept = chance >= 0.0 ? 1.0 : portable_exp(chance);
                     tally.accepted += accept;
                     if (!(u < accept)) return;
                     moved = true;
                     if (last_rung) {
                       chain.scores.insert(chain.scores.end(), scores.begin(), scores.end());
                       if (keep_states) chain.states.emplace_back(std::forward<decltype(x)>(x));
                     }
                     double const climbed = seen.log_likelihood - chain.here.log_likelihood;
                     tally.way += climbed * climbed / how.way_scale + settle(chain.at, fit);
                     chain.here = seen;
                   });
      if (moved) chain.arrive();
      chain.stay();
    }
  }

 private:
  static std::size_t choose(std::vector<arm> const& arms, double u) noexcept {
    std::size_t i = 0;
    for (double sum = arms[0].share; i + 1 < arms.size() && u >= sum; sum += arms[++i].share) {
    }
    return i;
  }

  /// Makes the proposal the chain's place; returns the squared way over the fitted words, each in units of twice its variance.
  double settle(chain_place& at, normal_fit const& fit) {
    std::size_t const size = next_.words.size(), k = fit.size();
    double way = 0.0;
    std::size_t const before = at.deviates.size();
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
    return k > 0 ? way / static_cast<double>(k) : 0.0;
  }

  Player player_;
  std::uint64_t seed_;
  char const* run_;
  draws source_;
  proposal next_;
};

}  // namespace steelyard::inline v1::detail
