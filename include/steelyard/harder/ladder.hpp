// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <cstdint>
#include <span>
#include <string>
#include <utility>
#include <vector>

#include <steelyard/base/algorithm.hpp>
#include <steelyard/base/executor.hpp>
#include <steelyard/harder/classes.hpp>
#include <steelyard/harder/mover.hpp>
#include <steelyard/harder/population.hpp>
#include <steelyard/harder/rung_settings.hpp>
#include <steelyard/run/run_worker.hpp>

namespace steelyard::inline v1::detail {

/// How a ladder is climbed.
struct ladder_terms {
  char const* run = "run_tempered";
  std::uint64_t seed = 1;
  std::size_t chains = 200, draws = 2000;
  std::uint64_t shortest = 20, longest = 400;
  double share = 0.5, level_share = 0.2;
  bool keep_states = true;
  std::vector<word_block> own;  ///< of the user's moves
};

/// A population on a ladder of rungs: chains of recorded words, moved by playing the sampler again.
template <class Worker>
class ladder {
 public:
  using state = typename Worker::state;

  ladder(ladder_terms terms, executor execute, worker_pool<Worker>& pool)
      : terms_(std::move(terms)), execute_(std::move(execute)), pool_(pool) {}

  /// Forgets all particles and settings, but neither the calls they cost nor whether chains were mixed: the next draws
  /// are those of another seed.
  void begin_again(std::uint64_t seed) {
    terms_.seed = seed;
    all_ = {};
    settings_ = {};
    rung_ = failed_ = 0;
  }

  /// Draws from the prior; draw i is lineage i. Some are played again, out of step.
  /// @throws hidden_state where one comes out differently
  void draw() {
    all_.trails = std::vector<trail<state>>(terms_.draws);
    each(terms_.draws, 64, [&](Worker& own, std::size_t i) {
      trail<state>& t = all_.trails[i];
      t.lineage = static_cast<std::uint32_t>(i);
      own.player().play(t.at.words, {terms_.seed, i, purpose::run, 0}, {terms_.run, i, 0},
                        [&](auto&&, mark const& seen, std::span<double const>) { t.here = seen; });
      t.arrive();
    });
    all_.read();
    look_again();
  }

  /// Weighs the population by the next target, and moves on there.
  /// @returns false, and stays, where all weights are zero
  bool climb(rung_target const& next, bool last) {
    rung_settings how;
    how.target = next;
    if (!all_.weigh(settings_.target, next)) return false;
    how.classes = find_classes(all_, next.level == impossible);
    begin_rung(last);
    prepare(how);
    move(how, last);
    settings_ = std::move(how);
    return true;
  }

  /// The same by settings found before: nothing is adapted.
  bool follow(rung_settings const& before, bool last) {
    if (!all_.weigh(settings_.target, before.target)) return false;
    begin_rung(last);
    settings_ = before;
    std::vector<std::vector<arm_tally>> tallies;
    walk(settings_, 1, settings_.length, last, tallies);
    end_rung();
    return true;
  }

  /// Plays every state of a rung that was not to be the last again, to keep scores and states as if it were.
  void keep_all() {
    each(all_.trails.size(), 8, [&](Worker& own, std::size_t c) {
      trail<state>& t = all_.trails[c];
      for (visit const& v : t.visits) own.look(t, v, {terms_.seed, c, rung_, true, terms_.keep_states});
    });
  }

  [[nodiscard]] population<state>& particles() noexcept { return all_; }
  [[nodiscard]] rung_settings const& settings() const noexcept { return settings_; }
  [[nodiscard]] rung_target const& target() const noexcept { return settings_.target; }
  [[nodiscard]] ladder_terms const& terms() const noexcept { return terms_; }
  [[nodiscard]] executor const& execute() const noexcept { return execute_; }
  [[nodiscard]] std::uint64_t calls() const noexcept { return calls_; }
  [[nodiscard]] std::uint64_t rung() const noexcept { return rung_; }
  /// Rungs whose chains did not forget where they began.
  [[nodiscard]] std::uint64_t unmixed() const noexcept { return unmixed_; }
  /// Runs of the sampler among the prior draws that failed and were set aside.
  [[nodiscard]] std::uint64_t failed() const noexcept { return failed_; }

  /// Calls act(worker, i) for i in [0, n) on the executor, so many to a task; counts the sampler's calls.
  template <class Act>
  void each(std::size_t n, std::size_t stretch, Act act) {
    std::size_t const tasks = (n + stretch - 1) / stretch;
    std::vector<std::pair<std::uint64_t, std::uint64_t>> seen(tasks);
    first_failure failure;
    execute_(tasks, [&](std::size_t task) {
      failure.guard(task * stretch, [&] {
        auto const own = pool_.take();
        for (std::size_t i = task * stretch; i < std::min(n, (task + 1) * stretch); ++i) {
          if (failure.before(i)) break;
          act(*own, i);
        }
        seen[task] = own->player().take_calls();
      });
    });
    failure.rethrow();
    for (auto const& [calls, failed] : seen) {
      calls_ += calls;
      if (rung_ == 0) failed_ += failed;
    }
  }

 private:
  void look_again() {
    auto const own = pool_.take();
    std::size_t const some = std::min<std::size_t>(32, terms_.draws);
    for (std::size_t s = some; s-- > 0;) {
      trail<state> const& t = all_.trails[s * terms_.draws / some];
      std::vector<std::uint64_t> words = t.at.words;
      mark now;
      own->player().play(words, {terms_.seed, t.lineage, purpose::run, 0}, {terms_.run, t.lineage, 0},
                         [&](auto&&, mark const& seen, std::span<double const>) { now = seen; });
      if (words.size() != t.at.words.size() || opaque_bits(now.log_likelihood) != opaque_bits(t.here.log_likelihood) ||
          opaque_bits(now.margin) != opaque_bits(t.here.margin))
        throw hidden_state(std::string(terms_.run) + ": " + hidden_state_text(t.lineage));
    }
    calls_ += own->player().take_calls().first;
  }

  void begin_rung(bool last) {
    ++rung_;
    draws source(terms_.seed, rung_, purpose::resample);
    all_.trails = all_.starts(terms_.chains, source.uniform());
    each(terms_.chains, 8, [&](Worker& own, std::size_t c) { own.begin(all_.trails[c], {terms_.seed, c, rung_, last, terms_.keep_states}); });
  }
  void end_rung() { all_.read(); }

  /// Arms, shares and the outlook of a rung, from its starts and from the rung before.
  void prepare(rung_settings& how) {
    std::size_t words = 0;
    std::vector<double> lls, margins, ones(terms_.chains, 1.0);
    for (auto const& t : all_.trails) {
      words += t.at.words.size();
      lls.push_back(t.here.log_likelihood);
      margins.push_back(t.here.margin);
    }
    how.reach = std::max<std::size_t>(1, words / terms_.chains);
    if (how.target.level > impossible) {
      auto const place = static_cast<std::ptrdiff_t>(terms_.level_share * static_cast<double>(terms_.chains));
      std::nth_element(margins.begin(), margins.begin() + place, margins.end(), [](double a, double b) { return a > b; });
      how.ahead.level = margins[static_cast<std::size_t>(place)];
    } else {
      how.ahead.top = *std::max_element(lls.begin(), lls.end());
      if (how.ahead.top > impossible) how.ahead.step = longest_step({lls, {}, ones}, 1e300, terms_.share * possible_share({lls, {}, ones}));
    }
    double mean = 0.0, square = 0.0, n = 0.0;
    for (auto const& t : all_.trails) {
      n += 1.0;
      double const f = how.ahead.weight(t.here), d = f - mean;
      mean += d / n;
      square += d * (f - mean);
    }
    how.way_unit = square > 0.0 ? 2.0 * square / n : 1.0;
    how.arms = settings_.arms.empty() ? first_arms(how.reach, how.target.level == impossible, terms_.own) : settings_.arms;
    for (arm& each : how.arms) each.scale *= std::clamp(each.trend, 0.2, 1.0);
    inherit_uses(how, settings_);
  }

  /// Walks all chains, adapting after every few steps, until they are long enough: five times the lag at which the
  /// correlation of the weight ahead falls to a tenth.
  void move(rung_settings& how, bool last) {
    std::uint64_t wanted = terms_.shortest;
    how.length = 1;
    bool mixed = false;
    while (how.length < wanted) {
      std::uint64_t const to = std::min(wanted, how.length + 4);
      std::vector<std::vector<arm_tally>> tallies;
      walk(how, how.length, to, last, tallies);
      how.length = to;
      std::vector<arm_tally> sums(how.arms.size() * how.classes.size());
      for (auto const& one : tallies)
        for (std::size_t a = 0; a < sums.size(); ++a) sums[a] += one[a];
      adapt(how, sums);
      if (how.length < wanted) continue;
      std::size_t const lag = forgetting_lag(how);
      mixed = lag > 0;
      std::uint64_t const length = mixed ? 5 * lag : 2 * how.length;
      wanted = std::max(wanted, std::min(terms_.longest, length));
    }
    if (!mixed) ++unmixed_;
    if (settings_.arms.size() == how.arms.size())
      for (std::size_t a = 0; a < how.arms.size(); ++a) how.arms[a].trend = how.arms[a].scale / settings_.arms[a].scale;
    end_rung();
  }
  void walk(rung_settings const& how, std::uint64_t from, std::uint64_t to, bool last, std::vector<std::vector<arm_tally>>& tallies) {
    tallies.assign(terms_.chains, std::vector<arm_tally>(how.arms.size() * how.classes.size()));
    each(terms_.chains, 8, [&](Worker& own, std::size_t c) {
      own.walk(all_.trails[c], {terms_.seed, c, rung_, last, terms_.keep_states}, from, to, how, tallies[c]);
    });
  }

  /// Lag at which the correlation of the weight ahead along the chains falls to 0.1; 0 where it does not within half
  /// their length.
  [[nodiscard]] std::size_t forgetting_lag(rung_settings const& how) const {
    auto const length = static_cast<std::size_t>(how.length);
    std::vector<double> series;
    series.reserve(terms_.chains * length);
    double mean = 0.0, variance = 0.0;
    for (auto const& t : all_.trails)
      for (visit const& v : t.visits) {
        double const f = how.ahead.weight(v.seen);
        series.insert(series.end(), static_cast<std::size_t>(v.steps), f);
        mean += f * static_cast<double>(v.steps);
      }
    mean /= static_cast<double>(series.size());
    for (double& f : series) {
      f -= mean;
      variance += f * f;
    }
    variance /= static_cast<double>(series.size());
    if (!(variance > 0.0)) return 0;
    for (std::size_t lag = 1; lag <= length / 2; ++lag) {
      double sum = 0.0;
      for (std::size_t c = 0; c < terms_.chains; ++c)
        for (std::size_t s = 0; s + lag < length; ++s) sum += series[c * length + s] * series[c * length + s + lag];
      if (sum <= 0.1 * variance * static_cast<double>(terms_.chains * (length - lag))) return lag;
    }
    return 0;
  }

  ladder_terms terms_;
  executor execute_;
  worker_pool<Worker>& pool_;
  population<state> all_;
  rung_settings settings_;
  std::uint64_t rung_ = 0, calls_ = 0, unmixed_ = 0, failed_ = 0;
};

}  // namespace steelyard::inline v1::detail
