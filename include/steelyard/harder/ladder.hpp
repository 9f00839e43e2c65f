// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <cstdint>
#include <memory>
#include <span>
#include <string>
#include <utility>
#include <vector>

#include <steelyard/base/algorithm.hpp>
#include <steelyard/base/executor.hpp>
#include <steelyard/harder/chain.hpp>
#include <steelyard/harder/rung.hpp>
#include <steelyard/sample/scheme.hpp>

namespace steelyard::inline v1::detail {

/// How long and how wide a ladder is.
struct ladder_terms {
  char const* run = "run_tempered";
  std::uint64_t seed = 1;
  std::size_t chains = 200, draws = 2000;
  std::uint64_t shortest = 20, longest = 400;
  double share = 0.5;
  bool keep_states = true;
  bool fitted = true;  ///< whether the fitted move takes part
};

/// A population climbing a ladder of rungs: chains of recorded words, moved by replaying the sampler.
/// Particles are what chains visited, in order of chain and step; lineage = the prior draw that one descends from.
template <class Player>
class ladder {
 public:
  using state = typename Player::state;
  using worker = mover<Player>;

  ladder(ladder_terms const& terms, executor const& execute, worker_pool<worker>& pool)
      : terms_(terms), execute_(execute), pool_(pool) {}

  /// Draws from the prior: draw i is lineage i.
  void draw() {
    trails_ = std::vector<trail<state>>(terms_.draws);
    each(terms_.draws, 64, [&](worker& own, std::size_t i) {
      trail<state>& t = trails_[i];
      t.lineage = static_cast<std::uint32_t>(i);
      own.player().play(t.at.words, {i, purpose::run, 0}, {terms_.run, i, 0},
                        [&](auto&&, mark const& seen, std::span<double const>) { t.here = seen; });
      t.arrive();
      t.stay();
    });
    influence_.assign(terms_.draws, 0.0);
    read_population();
  }

  /// Weighs the population by `next` over the present target and moves on: counts the step, resamples, moves, keeps all.
  void climb(rung_target const& next, bool last) {
    ++rung_;
    weigh_by(next);
    rung_settings how;
    how.target = next;
    if (terms_.fitted) fit(how);
    resample();
    prepare(how);
    move(how, last);
    target_ = next;
    read_population();
  }

  [[nodiscard]] std::span<double const> log_likelihoods() const noexcept { return lls_; }
  [[nodiscard]] std::span<double const> counts() const noexcept { return counts_; }
  [[nodiscard]] std::vector<trail<state>>& trails() noexcept { return trails_; }
  [[nodiscard]] double log_evidence() const noexcept { return log_evidence_; }
  [[nodiscard]] std::vector<double> const& influence() const noexcept { return influence_; }
  [[nodiscard]] std::uint64_t calls() const noexcept { return calls_; }
  [[nodiscard]] std::uint64_t rungs() const noexcept { return rung_; }
  [[nodiscard]] rung_target const& target() const noexcept { return target_; }
  [[nodiscard]] double correlation_lag() const noexcept { return lag_; }
  [[nodiscard]] bool mixed() const noexcept { return mixed_; }
  [[nodiscard]] std::uint64_t steps() const noexcept { return steps_; }
  [[nodiscard]] rung_settings const& settings() const noexcept { return settings_; }

 private:
  template <class Act>
  void each(std::size_t n, std::size_t stretch, Act act) {
    std::size_t const tasks = (n + stretch - 1) / stretch;
    std::vector<std::uint64_t> calls(tasks, 0);
    first_failure failure;
    execute_(tasks, [&](std::size_t task) {
      failure.guard(task * stretch, [&] {
        auto const own = pool_.take();
        for (std::size_t i = task * stretch; i < std::min(n, (task + 1) * stretch); ++i) {
          if (failure.before(i)) break;
          act(*own, i);
        }
        calls[task] = own->player().take_calls();
      });
    });
    failure.rethrow();
    for (std::uint64_t const c : calls) calls_ += c;
  }

  /// The particles in order: their log-likelihoods and how many steps each stands for.
  void read_population() {
    lls_.clear();
    counts_.clear();
    total_ = 0.0;
    for (auto const& t : trails_)
      for (visit const& v : t.visits) {
        lls_.push_back(v.seen.log_likelihood);
        counts_.push_back(static_cast<double>(v.steps));
        total_ += counts_.back();
      }
  }

  /// Weights of the particles for the next target; evidence and influence take them in.
  ///   logZ += log mean w;  D_e += sum over e of (w / mean w - 1) / N
  void weigh_by(rung_target const& next) {
    weights_.assign(lls_.size(), 0.0);
    double top = impossible;
    std::size_t p = 0;
    for (auto const& t : trails_)
      for (visit const& v : t.visits) {
        double const after = next.log_density(v.seen);
        weights_[p] = after > impossible ? after - target_.log_density(v.seen) : impossible;
        top = std::max(top, weights_[p++]);
      }
    double sum = 0.0;
    for (std::size_t i = 0; i < weights_.size(); ++i) {
      weights_[i] = weights_[i] > impossible ? counts_[i] * portable_exp(weights_[i] - top) : 0.0;
      sum += weights_[i];
    }
    log_evidence_ += top + portable_log(sum / total_);
    p = 0;
    for (auto const& t : trails_)
      for (std::size_t v = 0; v < t.visits.size(); ++v, ++p)
        influence_[t.lineage] += weights_[p] / sum - counts_[p] / total_;
  }

  /// A normal fit for each half of the lineages, from the particles of the other half under the new weights.
  void fit(rung_settings& how) {
    std::size_t k = 300;
    std::size_t p = 0;
    for (auto const& t : trails_)
      for (visit const& v : t.visits)
        if (weights_[p++] > 0.0) k = std::min(k, v.words);
    if (k == 0) return;
    for (std::size_t half = 0; half < 2; ++half) {
      std::vector<double> points, weights;
      double sum = 0.0, squares = 0.0;
      p = 0;
      for (auto const& t : trails_)
        for (visit const& v : t.visits) {
          double const w = weights_[p++];
          if ((t.lineage & 1u) == half || !(w > 0.0)) continue;
          std::span<std::uint64_t const> const words = t.words_of(v);
          for (std::size_t i = 0; i < k; ++i) points.push_back(normal_from_word(words[i]));
          weights.push_back(w);
          sum += w;
          squares += w * w;
        }
      how.fits[half] = squares > 0.0 ? normal_fit::of(points, weights, k, sum * sum / squares) : normal_fit();
      if (how.fits[half].size() == 0) how.fits[half] = settings_.fits[half];
    }
  }

  /// Systematic choice of the chains' starts, in the particles' order.
  void resample() {
    draws source(terms_.seed, rung_, purpose::resample);
    std::vector<std::size_t> const positions = systematic_positions(weights_, terms_.chains, source.uniform());
    std::vector<trail<state>> starts(terms_.chains);
    std::size_t p = 0, s = 0;
    for (auto const& t : trails_)
      for (visit const& v : t.visits) {
        for (; s < positions.size() && positions[s] == p; ++s) {
          starts[s].lineage = t.lineage;
          std::span<std::uint64_t const> const words = t.words_of(v);
          starts[s].at.words.assign(words.begin(), words.end());
          starts[s].here = v.seen;
        }
        ++p;
      }
    trails_ = std::move(starts);
  }

  /// Arms to begin with: those of the rung before where there are any.
  void prepare(rung_settings& how) {
    std::size_t reach = 1;
    double mean = 0.0, square = 0.0, n = 0.0;
    for (auto const& t : trails_) {
      reach += t.at.words.size();
      n += 1.0;
      double const d = t.here.log_likelihood - mean;
      mean += d / n;
      square += d * (t.here.log_likelihood - mean);
    }
    how.reach = std::max<std::size_t>(1, reach / trails_.size());
    how.way_scale = n > 1.0 && square > 0.0 ? 2.0 * square / n : 1.0;
    bool const fits = how.fits[0].size() > 0 && how.fits[1].size() > 0;
    how.arms = settings_.arms;
    if (how.arms.empty()) {
      for (double included = 1.0;; included = std::max(included / 4.0, 1.0 / static_cast<double>(how.reach))) {
        how.arms.push_back({move_kind::shift, 0.3, included, 0.0});
        how.arms.push_back({move_kind::autoregressive, 0.5, included, 0.0});
        how.arms.push_back({move_kind::fresh, 1.0, included, 0.0});
        if (included * static_cast<double>(how.reach) <= 1.0) break;
      }
      if (fits) how.arms.push_back({move_kind::fitted, 0.7, 1.0, 0.0});
      for (arm& each : how.arms) each.share = 1.0 / static_cast<double>(how.arms.size());
    }
  }

  /// Walks all chains, adapting scales and shares after every few steps, until they are long enough.
  void move(rung_settings& how, bool last) {
    each(trails_.size(), 8, [&](worker& own, std::size_t c) { own.begin(trails_[c], c, rung_, last, terms_.keep_states); });
    steps_ = 0;
    mixed_ = false;
    std::uint64_t wanted = terms_.shortest;
    while (steps_ < wanted) {
      std::uint64_t const to = std::min(wanted, steps_ + 5);
      std::vector<std::vector<arm_tally>> tallies(trails_.size(), std::vector<arm_tally>(how.arms.size()));
      each(trails_.size(), 8, [&](worker& own, std::size_t c) {
        own.walk(trails_[c], c, rung_, steps_, to, how, last, terms_.keep_states, tallies[c]);
      });
      steps_ = to;
      std::vector<arm_tally> all(how.arms.size());
      for (auto const& one : tallies)
        for (std::size_t a = 0; a < all.size(); ++a) all[a] += one[a];
      adapt(how, all);
      if (steps_ < wanted || steps_ >= terms_.longest) continue;
      lag_ = find_lag();
      mixed_ = lag_ > 0.0;
      double const length = mixed_ ? 5.0 * lag_ : 2.0 * static_cast<double>(steps_);
      wanted = std::max(wanted, std::min(terms_.longest, static_cast<std::uint64_t>(length)));
    }
    settings_ = how;
  }

  /// Scales towards an acceptance of 0.25; shares in proportion to the squared way a call goes, none below a floor.
  static void adapt(rung_settings& how, std::vector<arm_tally> const& seen) {
    double sum = 0.0;
    std::vector<double> worth(seen.size());
    for (std::size_t a = 0; a < seen.size(); ++a) {
      arm& each = how.arms[a];
      double const acceptance = (seen[a].accepted + 0.25) / (seen[a].tries + 1.0);
      if (each.kind != move_kind::fresh) {
        double const most = 1.0;
        each.scale = std::clamp(each.scale * portable_exp(1.5 * (acceptance - 0.25)), 1e-6, most);
      }
      double const fresh = seen[a].tries > 0.0 ? seen[a].way / seen[a].tries : 0.0;
      worth[a] = fresh;
      sum += fresh;
    }
    double const floor = 0.1 / static_cast<double>(seen.size());
    for (std::size_t a = 0; a < seen.size(); ++a) {
      double const wanted = sum > 0.0 ? floor + 0.9 * worth[a] / sum : 1.0 / static_cast<double>(seen.size());
      how.arms[a].share = 0.5 * how.arms[a].share + 0.5 * wanted;
    }
  }

  /// Lag at which the correlation of the log-likelihood along the chains falls to 0.1; 0 where it does not within half their length.
  [[nodiscard]] double find_lag() const {
    std::size_t const length = static_cast<std::size_t>(steps_);
    std::vector<double> series;
    series.reserve(trails_.size() * length);
    double mean = 0.0;
    for (auto const& t : trails_)
      for (visit const& v : t.visits)
        for (std::uint64_t s = 0; s < v.steps; ++s) {
          series.push_back(v.seen.log_likelihood);
          mean += v.seen.log_likelihood;
        }
    mean /= static_cast<double>(series.size());
    double variance = 0.0;
    for (double& x : series) {
      x -= mean;
      variance += x * x;
    }
    if (!(variance > 0.0)) return 0.0;
    variance /= static_cast<double>(series.size());
    for (std::size_t lag = 1; lag <= length / 2; ++lag) {
      double sum = 0.0;
      for (std::size_t c = 0; c < trails_.size(); ++c)
        for (std::size_t s = 0; s + lag < length; ++s) sum += series[c * length + s] * series[c * length + s + lag];
      if (sum <= 0.1 * variance * static_cast<double>(trails_.size() * (length - lag))) return static_cast<double>(lag);
    }
    return 0.0;
  }

  ladder_terms terms_;
  executor const& execute_;
  worker_pool<worker>& pool_;
  rung_target target_;
  std::vector<trail<state>> trails_;
  std::vector<double> lls_, counts_, weights_, influence_;
  double total_ = 0.0, log_evidence_ = 0.0, lag_ = 0.0;
  bool mixed_ = true;
  std::uint64_t rung_ = 0, calls_ = 0, steps_ = 0;
  rung_settings settings_;
};

}  // namespace steelyard::inline v1::detail
