// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstdint>
#include <functional>
#include <memory>
#include <string>
#include <tuple>
#include <utility>
#include <vector>

#include <steelyard/base/chrono.hpp>
#include <steelyard/harder/ladder.hpp>
#include <steelyard/harder/tempered_plan.hpp>
#include <steelyard/run/threads.hpp>

namespace steelyard::inline v1::detail {

/// Progress, time limit and stop token of a climb, looked at after each rung.
class rung_watch {
 public:
  using clock = std::chrono::steady_clock;
  explicit rung_watch(tempered_plan const& how) : how_(how), start_(clock::now()) {}

  /// @returns why the climb must end here; null: it need not
  [[nodiscard]] char const* after_rung(std::uint64_t calls, std::uint64_t failed) const {
    auto const now = clock::now();
    if (how_.progress) how_.progress({calls, 0, failed, std::chrono::duration_cast<std::chrono::nanoseconds>(now - start_)});
    if (how_.token.stop_requested()) return "a stop was asked for";
    if (how_.time_limit.count() > 0 && now - start_ >= how_.time_limit) return "the time limit was reached";
    return nullptr;
  }

 private:
  tempered_plan const& how_;
  clock::time_point start_;
};

inline ladder_terms terms_of(tempered_plan const& how, char const* run) {
  ladder_terms terms;
  terms.run = run;
  terms.seed = how.seed;
  terms.chains = static_cast<std::size_t>(how.chains.value());
  terms.draws = how.draws == 0u ? std::max<std::size_t>(2000, 10 * terms.chains) : static_cast<std::size_t>(how.draws.value());
  terms.shortest = how.shortest;
  terms.longest = how.longest;
  terms.share = how.share;
  terms.level_share = how.level_share;
  terms.keep_states = how.keep == keeping::states;
  return terms;
}

/// Another seed, for the run that follows a pilot.
inline std::uint64_t seed_after_pilot(std::uint64_t seed) noexcept {
  return philox({0, 0, static_cast<std::uint64_t>(purpose::move), ~std::uint64_t{0}}, seed, 0)[0];
}

inline constexpr std::uint64_t most_rungs = 2000;
inline void refuse_endless(ladder_terms const& terms, std::uint64_t rung) {
  if (rung >= most_rungs)
    throw error(std::string(terms.run) + ": " + std::to_string(most_rungs) +
                " rungs did not reach the reading; its likelihood falls more steeply than chains can follow");
}

/// Whether the last step may be taken whole: a step that leaves a share s of the effective size costs the log-evidence a
/// variance in proportion to 1/s - 1, and the last one may cost half as much again as others. A rung for the sliver
/// beyond would take as many calls as any other.
inline bool enough_at_last(double left, double share) noexcept { return left > 0.0 && 1.0 / left - 1.0 <= 1.5 * (1.0 / share - 1.0); }

/// Climbs from the prior to the posterior by powers of the likelihood, and keeps how.
/// @param finish  whether the posterior is the last rung
/// @returns why the climb ended early; null where it did not
/// @throws no_likelihood where no draw has any
template <class Worker>
char const* temper(ladder<Worker>& on, rung_watch const& watch, bool finish, std::vector<rung_settings>& record) {
  ladder_terms const& terms = on.terms();
  double const possible = possible_share(on.particles().view());
  if (!(possible > 0.0))
    throw no_likelihood(std::string(terms.run) + ": none of the " + std::to_string(terms.draws) +
                        " draws from the prior that were tried has any likelihood: each is impossible under the reading; "
                        "check the likelihood, try more draws (plan.draws), or draw from a wider prior");
  while (on.target().power < 1.0) {
    refuse_endless(terms, on.rung());
    bool const zeros = on.rung() == 0 && possible < terms.share;
    double const most = 1.0 - on.target().power;
    bool const whole = !zeros && enough_at_last(step_share(on.particles().view(), most), terms.share);
    double const step = zeros ? 0.0 : whole ? most : longest_step(on.particles().view(), most, terms.share);
    bool const there = !(step < most);
    rung_target next;
    next.possible_only = true;
    next.power = there ? 1.0 : on.target().power + step;
    if (!there && !zeros && !(next.power > on.target().power)) refuse_endless(terms, most_rungs);
    on.climb(next, there && finish);
    record.push_back(on.settings());
    char const* const ended = watch.after_rung(on.calls(), on.failed());
    if (ended != nullptr && !(there && finish)) return ended;
  }
  return nullptr;
}

template <class Worker>
finding stopped_finding(ladder<Worker> const& on, char const* why) {
  return {finding_kind::stopped, "The run ended on rung " + std::to_string(on.rung()) + " because " + why + ": its states follow the likelihood to the power " +
                                     short_number(on.target().power) + ", and weights make up for the rest."};
}

/// Climbs the same rungs again.
template <class Worker>
char const* repeat(ladder<Worker>& on, rung_watch const& watch, std::vector<rung_settings> const& record) {
  for (std::size_t r = 0; r < record.size(); ++r) {
    bool const last = r + 1 == record.size();
    if (!on.follow(record[r], last))
      throw no_likelihood(std::string(on.terms().run) + ": with the rungs of the pilot run fixed, no particle reached rung " +
                          std::to_string(r + 1) + " of " + std::to_string(record.size()) + "; use more chains");
    char const* const ended = watch.after_rung(on.calls(), on.failed());
    if (ended != nullptr && !last) return ended;
  }
  return nullptr;
}

}  // namespace steelyard::inline v1::detail
