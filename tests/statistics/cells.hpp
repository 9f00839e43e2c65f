// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <steelyard/estimate/estimate.hpp>
#include <steelyard/run/threads.hpp>

#include <boost/math/distributions/binomial.hpp>

#include <array>
#include <cmath>
#include <cstddef>
#include <cstdint>
#include <cstdio>
#include <cstdlib>
#include <string>
#include <utility>
#include <vector>

// A cell is a problem, a size and a question, asked over and over: seeds 1, 2, 3, ..., never chosen.

namespace known {

namespace sy = steelyard;

/// Whether the long run is asked for.
inline bool honest() {
  char const* const said = std::getenv("STEELYARD_HONEST");
  return said != nullptr && *said != '\0' && std::string(said) != "0";
}

inline constexpr std::array<double, 3> levels{0.90, 0.95, 0.99};

/// One answer beside the truth.
struct asked {
  double value = 0.0;
  double standard_error = 0.0;
  double truth = 0.0;
  sy::verdict verdict = sy::verdict::broken;
  std::array<sy::interval, levels.size()> limits{};

  asked() = default;
  template <class Estimate>
  asked(Estimate const& e, double its_truth)
      : value(e.value), standard_error(e.standard_error), truth(its_truth), verdict(e.verdict()) {
    for (std::size_t l = 0; l < levels.size(); ++l) limits[l] = e.error_interval(levels[l]);
  }
};

/// Hits that a coverage anywhere in [lowest, highest] gives, but for one time in 10 000 on either side.
struct hit_limits {
  std::uint64_t least = 0, most = 0;

  hit_limits(std::uint64_t repeats, double lowest, double highest) : most(repeats) {
    boost::math::binomial const low(static_cast<double>(repeats), lowest), high(static_cast<double>(repeats), highest);
    while (cdf(low, static_cast<double>(least)) <= 1e-4) ++least;
    while (most > 0 && cdf(complement(high, static_cast<double>(most - 1))) <= 1e-4) --most;
  }
};

/// Coverage that is accepted of a nominal level: misses between half and 1.4 times as many as it allows, which is 93 to
/// 97.5 % for 95 %.
inline hit_limits accepted(double level, std::uint64_t repeats) {
  return {repeats, 1.0 - 1.4 * (1.0 - level), 1.0 - 0.5 * (1.0 - level)};
}

/// What came of all the runs of a cell.
struct cell {
  std::uint64_t runs = 0;
  std::array<std::uint64_t, 3> verdicts{};  ///< sound, strained, broken
  std::array<std::uint64_t, levels.size()> hits{};
  std::uint64_t below = 0, above = 0;       ///< 95 % intervals wholly below and above the truth
  std::uint64_t far = 0, sound_and_far = 0; ///< off by more than four standard errors
  std::uint64_t with_error = 0;             ///< runs with a standard error above zero
  double sum_z = 0.0, sum_z2 = 0.0;

  void add(asked const& a) {
    ++runs;
    ++verdicts[static_cast<std::size_t>(a.verdict)];
    for (std::size_t l = 0; l < levels.size(); ++l) {
      sy::interval const& i = a.limits[l];
      bool const under = i.upper_known && i.upper < a.truth, over = i.lower_known && i.lower > a.truth;
      hits[l] += under || over ? 0u : 1u;
      if (levels[l] != 0.95) continue;
      below += under ? 1u : 0u;
      above += over ? 1u : 0u;
    }
    double const off = a.value - a.truth;
    if (std::abs(off) > 4.0 * a.standard_error) {
      ++far;
      sound_and_far += a.verdict == sy::verdict::sound ? 1u : 0u;
    }
    if (!(a.standard_error > 0.0)) return;
    ++with_error;
    double const z = off / a.standard_error;
    sum_z += z;
    sum_z2 += z * z;
  }
  cell& operator+=(cell const& other) {
    runs += other.runs;
    for (std::size_t v = 0; v < verdicts.size(); ++v) verdicts[v] += other.verdicts[v];
    for (std::size_t l = 0; l < hits.size(); ++l) hits[l] += other.hits[l];
    below += other.below;
    above += other.above;
    far += other.far;
    sound_and_far += other.sound_and_far;
    with_error += other.with_error;
    sum_z += other.sum_z;
    sum_z2 += other.sum_z2;
    return *this;
  }

  [[nodiscard]] double share(std::uint64_t n) const { return static_cast<double>(n) / static_cast<double>(runs); }
  [[nodiscard]] double mean_z() const { return with_error > 0 ? sum_z / static_cast<double>(with_error) : 0.0; }
  [[nodiscard]] double mean_z2() const { return with_error > 0 ? sum_z2 / static_cast<double>(with_error) : 0.0; }
  /// At least 95 % of the runs say `sound`.
  [[nodiscard]] bool promises() const { return 20 * verdicts[0] >= 19 * runs; }
  /// Where the hits at a level lie: 0 within the limits, -1 too few, 1 too many.
  [[nodiscard]] int verdict_on(std::size_t level) const {
    hit_limits const limits = accepted(levels[level], runs);
    return hits[level] < limits.least ? -1 : hits[level] > limits.most ? 1 : 0;
  }
};

/// All cells of one problem and size, a cell for each question: ask(seed) -> std::vector<asked>.
template <class Ask>
std::vector<cell> ask_often(std::uint64_t repeats, Ask const& ask) {
  constexpr std::uint64_t together = 25;
  std::vector<std::vector<cell>> parts(static_cast<std::size_t>((repeats + together - 1) / together));
  sy::on_threads(0)(parts.size(), [&](std::size_t t) {
    for (std::uint64_t seed = t * together + 1; seed <= repeats && seed <= (t + 1) * together; ++seed) {
      std::vector<asked> const answers = ask(seed);
      parts[t].resize(answers.size());
      for (std::size_t q = 0; q < answers.size(); ++q) parts[t][q].add(answers[q]);
    }
  });
  std::vector<cell> all(parts.front().size());
  for (std::vector<cell> const& part : parts)
    for (std::size_t q = 0; q < all.size(); ++q) all[q] += part[q];
  return all;
}

inline void print_heading() {
  std::printf("%-36s %6s  %-20s %6s %8s %6s | %6s %6s %6s %6s %6s | %6s %6s | %6s %6s\n", "problem", "size", "question", "sound",
              "strained", "broken", "90 %", "95 %", "99 %", "below", "above", "z", "z^2", "far", "&sound");
}
/// One line a cell: verdicts, coverage, misses on either side, mean z and z^2, runs off by more than four standard errors, and
/// those of them called sound; all but z and z^2 in per cent.
inline void print(std::string const& problem, std::size_t size, std::string const& question, cell const& c,
                  std::string const& note) {
  auto const percent = [&](std::uint64_t n) { return 100.0 * c.share(n); };
  std::printf("%-36s %6zu  %-20s %6.1f %8.1f %6.1f | %6.2f %6.2f %6.2f %6.2f %6.2f | %6.3f %6.3f | %6.2f %6.2f  %s\n",
              problem.c_str(), size, question.c_str(), percent(c.verdicts[0]), percent(c.verdicts[1]),
              percent(c.verdicts[2]), percent(c.hits[0]), percent(c.hits[1]), percent(c.hits[2]), percent(c.below),
              percent(c.above), c.mean_z(), c.mean_z2(), percent(c.far), percent(c.sound_and_far), note.c_str());
}

}  // namespace known
