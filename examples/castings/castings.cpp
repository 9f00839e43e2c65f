// SPDX-License-Identifier: BSL-1.0
// What do castings look like on whose card the inspection line wrote
// "shrinkage"? All data here are invented; see foundry.hpp.
//
// The line's scores are chances of what it writes, so the score of "shrinkage"
// is the likelihood of that card: each casting counts in proportion to it. The
// same question is then asked the way it is often done, by accepting castings
// whose score passes a threshold, to show what that answers instead.
//
// A casting that carries load needs its drawing's acceptance standard and a
// qualified inspector, not this program.
#include <cmath>
#include <cstddef>
#include <cstdio>
#include <string>

#include <steelyard/steelyard.hpp>

#include "foundry.hpp"

namespace sy = steelyard;
using foundry::casting;

namespace {

constexpr auto shrinkage = static_cast<std::size_t>(foundry::flaw::shrinkage);

double largest(casting const& c) { return c.largest_pore; }

/// Sectioned afterwards (invented): rows are what was found, columns what the card said.
auto const audit = sy::confusion_counts({{61, 6, 9}, {4, 48, 13}, {8, 11, 70}});

void line(char const* what, sy::estimate const& mean, sy::interval_result const& range) {
  std::printf("  %-38s %s mm; 95 %% of them between %.2f and %.2f mm\n", what, to_string(mean).c_str(), range.lower.value,
              range.upper.value);
}

void picture(casting const& c) {
  for (std::size_t r = 0; r < foundry::side; r += 2) {
    std::printf("      ");
    for (std::size_t k = 0; k < foundry::side; ++k) {
      double const area = c.pore_area[r * foundry::side + k] + c.pore_area[(r + 1) * foundry::side + k];
      std::putchar(area == 0.0 ? '.' : area < 0.1 ? ':' : area < 0.6 ? 'o' : area < 2.0 ? 'O' : '@');
    }
    std::putchar('\n');
  }
}

}  // namespace

int main() {
  auto card_says_shrinkage = [](casting const& c) { return sy::likelihood{foundry::grade(c)[shrinkage]}; };
  sy::pipeline pipe{&foundry::pour, card_says_shrinkage};
  auto const sample = pipe.run({.size = 40'000, .seed = 3});

  std::printf("Largest pore of a casting\n");
  auto const all = sample.before();
  line("of every casting poured", all.expectation(&largest), all.interval(&largest, 0.95));
  auto const mean = sample.expectation(&largest);
  line("whose card says shrinkage", mean, sample.interval(&largest, 0.95));

  // Taken into account that the line confuses flaws: castings that are shrinkage when sectioned.
  auto const grader = sy::class_grader(audit, {.prevalence = {73.0 / 230, 65.0 / 230, 92.0 / 230}});
  auto const corrected = sample.reweigh([&](casting const& c) { return grader.score(foundry::grade(c), foundry::flaw::shrinkage); });
  auto const found = corrected.expectation(&largest);
  line("found to be shrinkage when sectioned", found, corrected.interval(&largest, 0.95));

  std::printf("\nThe same asked by a threshold on the score\n");
  double gap = 0.0, gap_error = 1.0;
  for (double const threshold : {0.5, 0.8, 0.95}) {
    auto const accepted = all.given([=](casting const& c) { return foundry::grade(c)[shrinkage] > threshold; });
    auto const answer = accepted.expectation(&largest);
    line(("accepted above " + std::to_string(threshold).substr(0, 4)).c_str(), answer, accepted.interval(&largest, 0.95));
    gap = answer.value - mean.value;
    gap_error = std::hypot(answer.standard_error, mean.standard_error);
  }
  auto const passed = sample.probability([](casting const& c) { return foundry::grade(c)[shrinkage] > 0.8; });
  std::printf("  Of the castings with that card only %s have a score above 0.8: a threshold leaves\n"
              "  out the many that say shrinkage faintly, and answers for the clear cases alone.\n",
              to_string(passed).c_str());

  std::printf("\nTwelve castings with that card, drawn at random\n");
  auto const twelve = sample.resample(12, {.seed = 4, .scheme = sy::scheme::multinomial});
  for (std::size_t i = 0; i < twelve.size(); ++i) {
    auto const s = foundry::grade(twelve[i]);
    std::printf("  %2zu  largest pore %.2f mm, scores: sound %.2f, shrinkage %.2f, gas %.2f\n", i + 1, twelve[i].largest_pore,
                s[0], s[1], s[2]);
    if (i < 2) picture(twelve[i]);
  }
  std::printf("\n%s\n", to_string(sample.diagnosis()).c_str());

  // Check: write the cards themselves, with the scores as chances, and keep the castings whose card says shrinkage.
  auto const cards = sy::pipeline{[](sy::draws& draws) {
                                    casting c = foundry::pour(draws);
                                    bool const says = draws.chance(foundry::grade(c)[shrinkage]);
                                    return std::pair{c.largest_pore, says};
                                  },
                                  [](std::pair<double, bool> const& c) { return sy::likelihood{c.second ? 1.0 : 0.0}; }}
                         .expectation({.size = 40'000, .seed = 5}, [](std::pair<double, bool> const& c) { return c.first; });
  double const apart = std::abs(cards.value - mean.value) / std::hypot(cards.standard_error, mean.standard_error);
  std::printf("Written out card by card instead: %s mm, %.1f standard errors away\n", to_string(cards).c_str(), apart);
  bool const fine = apart < 5.0 && gap > 5.0 * gap_error && mean.verdict() == sy::verdict::sound;
  return fine ? 0 : 1;
}
