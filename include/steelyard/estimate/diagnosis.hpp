// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstdint>
#include <iosfwd>
#include <span>
#include <string>
#include <utility>
#include <vector>

#include <steelyard/base/elementary.hpp>
#include <steelyard/base/text.hpp>
#include <steelyard/estimate/verdict.hpp>

namespace steelyard::inline v1 {

/// What a finding is about; its sentence says the rest.
enum class finding_kind {
  few_effective,   ///< the weights carry little
  one_dominates,   ///< a single sample holds much of the weight
  many_zeros,      ///< most states are impossible
  failed_runs,     ///< runs of the simulator gave no state
  stopped,         ///< the run ended before its size
  hidden_state,    ///< replayed samples differ from the first run
  few_groups,      ///< too few independent groups for an error bar
  target_missed,   ///< a target for the standard error was not met within the size
  reading_doubt,   ///< a reading looks off scale
  heavy_tail,      ///< the largest weights fall off so slowly that error bars settle slowly
  not_mixed,       ///< chains of a tempered run did not forget where they began
  far_from_drawn,  ///< a tempered sample is asked under other weights than those it was moved under
  cost,            ///< what was done, and what it cost
};

/// One sentence with the numbers and the next step.
struct finding {
  finding_kind kind;
  std::string text;
};

/// Whether the weights can carry questions at all.
class diagnosis {
 public:
  struct numbers {
    std::uint64_t drawn = 0, states = 0, zeros = 0, failed = 0;
    double effective_size = 0.0, perplexity = 0.0, largest_share = 0.0, groups = 0.0;
    double tail_index = 0.0, tail_error = 0.0;
    bool tail_known = false, bounded = false;
    double lineages = 0.0;        ///< effective number after tempering; 0: another kind of sample
    bool far_from_drawn = false;  ///< of a tempered sample: other weights than those it was moved under
  };

  diagnosis() = default;
  diagnosis(numbers const& n, std::vector<finding> findings) : n_(n), findings_(std::move(findings)) { judge(); }

  /// Kish: (sum w)^2 / sum w^2, between 1 and n.                 [Kish, Survey Sampling, 1965]
  [[nodiscard]] double effective_size() const noexcept { return n_.effective_size; }
  /// exp(-sum W ln W), between 1 and n.
  [[nodiscard]] double perplexity() const noexcept { return n_.perplexity; }
  /// Largest normalised weight.
  [[nodiscard]] double largest_share() const noexcept { return n_.largest_share; }
  /// Shape of the generalised Pareto law of the largest weights: from 0.5 on their variance may be infinite, from 1 on
  /// their mean. Bounded likelihoods reach 0.7 harmlessly. 0 where not known.
  [[nodiscard]] double tail_index() const noexcept { return n_.tail_index; }
  /// Its standard error, about.
  [[nodiscard]] double tail_index_error() const noexcept { return n_.tail_error; }
  /// False where there are fewer than 25 positive weights, or too many equal ones among the largest.
  [[nodiscard]] bool tail_known() const noexcept { return n_.tail_known; }
  /// Whether the weighter declared a bound on the likelihood.
  [[nodiscard]] bool bounded() const noexcept { return n_.bounded; }
  /// Whether error bars can be trusted to shrink as n^(-1/2): the likelihood has a declared bound, or the tail index is
  /// below 0.5 by more than its standard error.
  [[nodiscard]] bool settles() const noexcept {
    return n_.bounded || (n_.tail_known && n_.tail_index + n_.tail_error < 0.5);
  }
  /// How many samples it takes for answers to settle at all, exp(KL(posterior || prior)), from this sample: samples
  /// over perplexity. A sample that falls short of it makes it too small.
  ///                                         [Chatterjee & Diaconis, Ann. Appl. Probab. 28, 2018, 1099]
  [[nodiscard]] double least_size() const noexcept {
    return n_.perplexity > 0.0 ? static_cast<double>(n_.drawn) / n_.perplexity : 0.0;
  }
  /// Share of the states that are impossible.
  [[nodiscard]] double share_of_zeros() const noexcept {
    return n_.states > 0 ? static_cast<double>(n_.zeros) / static_cast<double>(n_.states) : 0.0;
  }
  /// Effective number of lineages after tempering, 1 / sum m_e^2; 0 for another kind of sample.
  [[nodiscard]] double lineages() const noexcept { return n_.lineages; }
  [[nodiscard]] std::uint64_t drawn() const noexcept { return n_.drawn; }
  [[nodiscard]] std::uint64_t failed() const noexcept { return n_.failed; }
  [[nodiscard]] std::span<finding const> findings() const noexcept { return findings_; }

  /// The verdict on the weights alone: sound from an effective size of 50 unless the tail index is above 0.7, broken
  /// below a size of 5. After tempering the effective lineages decide: sound from 20, broken below 2. Each estimate
  /// has a verdict of its own, which can be worse.
  [[nodiscard]] steelyard::verdict verdict() const noexcept {
    if (n_.lineages > 0.0)
      return n_.lineages < 2.0                            ? steelyard::verdict::broken
             : n_.lineages < 20.0 || n_.far_from_drawn    ? steelyard::verdict::strained
                                                          : steelyard::verdict::sound;
    bool const heavy = n_.tail_known && n_.tail_index > heavy_from;
    return n_.effective_size < 5.0             ? steelyard::verdict::broken
           : n_.effective_size < 50.0 || heavy ? steelyard::verdict::strained
                                               : steelyard::verdict::sound;
  }

 private:
  void judge() {
    using detail::short_number;
    auto say = [&](finding_kind kind, std::string text) { findings_.push_back({kind, std::move(text)}); };
    double const drawn = static_cast<double>(n_.drawn);
    if (n_.lineages > 0.0) return judge_lineages();
    if (n_.effective_size < 50.0)
      say(finding_kind::few_effective,
          "The weights are worth " + (n_.effective_size < 1.5 ? "no more than one draw" : "only " + short_number(n_.effective_size) + " equal draws") + " out of " +
              short_number(drawn) + ": draw more, or use a tempered run if the reading is this sharp. " + size_advice());
    if (n_.tail_known && n_.tail_index > heavy_from)
      say(finding_kind::heavy_tail,
          "The largest weights fall off slowly, with tail index " + short_number(n_.tail_index) +
              " where up to 0.7 is well: the next samples may outweigh all so far, unless the likelihood has a bound not "
              "far above the largest one seen. Let the simulator draw closer to what was read, or use a tempered run.");
    if (n_.largest_share > 0.1)
      say(finding_kind::one_dominates, "One sample holds " + short_number(100.0 * n_.largest_share) +
                                           " % of the weight: what it says is nearly the whole answer.");
    if (share_of_zeros() > 0.5)
      say(finding_kind::many_zeros, short_number(100.0 * share_of_zeros()) +
                                        " % of the states are impossible under the reading: check its limits, or let "
                                        "the simulator draw closer to what was read.");
    if (n_.failed > 0) {
      double const share = static_cast<double>(n_.failed) / drawn;
      double const mean_size = n_.effective_size > 0.0 ? n_.largest_share : 0.0;
      double const worst = static_cast<double>(n_.failed) * mean_size;
      say(finding_kind::failed_runs,
          std::to_string(n_.failed) + " of " + std::to_string(n_.drawn) + " runs (" + short_number(100.0 * share) +
              " %) failed and were set aside. Had each been as likely as the best state seen, they would hold " +
              short_number(100.0 * worst / (1.0 + worst)) +
              " % of the weight: at worst every probability could move by that much. Find out whether they fail where "
              "the reading points.");
    }
    if (n_.groups > 0.0 && n_.groups < 8.0)
      say(finding_kind::few_groups, "There are only " + short_number(n_.groups) +
                                        " independent groups: an error bar wants at least 8 of them.");
  }

  void judge_lineages() {
    using detail::short_number;
    if (n_.far_from_drawn)
      findings_.push_back({finding_kind::far_from_drawn,
                           "These weights lie far from those that the states were moved under, and are worth " +
                               short_number(n_.effective_size) + " of " + short_number(static_cast<double>(n_.drawn)) +
                               " equal ones: error bars can be far too small. Run again with the readings that are asked about."});
    if (n_.lineages < 20.0)
      findings_.push_back({finding_kind::few_groups,
                           "The states descend from only " + short_number(n_.lineages) +
                               " effective lineages, where error bars want 20: use more chains. Draw one word for each "
                               "variate (draws.normal(), not a rejection method), or give a move of your own for words "
                               "that act together."});
  }

  /// How many samples it takes: for answers to settle at all, and, where that can be said, for an effective size of 50.
  [[nodiscard]] std::string size_advice() const {
    std::string text = "The reading asks for at least about " + detail::short_number(least_size()) +
                       " samples before answers settle at all";
    if (n_.effective_size >= 5.0 && settles())
      text += "; about " + detail::short_number(static_cast<double>(n_.drawn) * (50.0 / n_.effective_size)) +
              " would be worth 50 equal draws";
    return text + ".";
  }

  static constexpr double heavy_from = 0.7;

  numbers n_;
  std::vector<finding> findings_;
};

/// Plain sentences: what the weights carry, then each finding.
[[nodiscard]] inline std::string to_string(diagnosis const& d) {
  using detail::short_number;
  std::string text;
  if (d.lineages() > 0.0)
    text = std::to_string(d.drawn()) + " states of a tempered run descend from " + short_number(d.lineages()) + " effective lineages.";
  else
    text = std::to_string(d.drawn()) + " samples are worth " +
                     (d.effective_size() < 1.5 ? "no more than one" : short_number(d.effective_size()) + " equal ones") +
                     "; the heaviest holds " + short_number(100.0 * d.largest_share()) + " % of the weight.";
  text += d.verdict() == verdict::sound      ? " The weights can carry questions."
          : d.verdict() == verdict::strained ? " The weights are strained: take answers as orders of magnitude."
                                             : " The weights are broken: do not use the answers.";
  for (finding const& each : d.findings()) text += "\n" + each.text;
  return text;
}

template <class Char, class Traits>
std::basic_ostream<Char, Traits>& operator<<(std::basic_ostream<Char, Traits>& out, diagnosis const& d) {
  return out << to_string(d).c_str();
}

}  // namespace steelyard::inline v1
