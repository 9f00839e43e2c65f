// SPDX-License-Identifier: BSL-1.0
// A moored barge waits for a storm. Two load-cell readings tell something of its line; what is the chance that the next
// storm loads it beyond its rating, and what would such a storm look like? Barge, berth and readings are invented.

#include <algorithm>
#include <charconv>
#include <cmath>
#include <cstdint>
#include <cstdio>
#include <exception>
#include <iostream>
#include <stdexcept>
#include <string>
#include <string_view>
#include <vector>

#include <steelyard/steelyard.hpp>
#include <steelyard/tempered.hpp>

#include "readings.hpp"
#include "storm.hpp"

namespace sy = steelyard;
using mooring::state;

namespace {

struct options {
  std::string readings;
  std::uint64_t seed = 1, threads = 1;
  bool help = false;
};
class bad_option : public std::runtime_error {
 public:
  using std::runtime_error::runtime_error;
};

constexpr char usage[] =
    "mooring [options] READINGS: the chance that a storm loads a barge's head line beyond its rating.\n"
    "  --seed N     which random numbers; the same seed gives the same answer (default: 1)\n"
    "  --threads N  on so many threads, 0 for all cores; the answer is the same (default: 1)\n"
    "  --help       this text\n"
    "Returns 0, 1 where the file or the answer is wrong, 2 where the command line is.\n";

options options_from(int count, char const* const* words) {
  options chosen;
  for (int i = 1; i < count; ++i) {
    std::string_view const word = words[i];
    auto const number = [&](std::uint64_t highest) {
      std::string_view const text = i + 1 < count ? words[++i] : "";
      std::uint64_t value = 0;
      auto const [stop, problem] = std::from_chars(text.data(), text.data() + text.size(), value);
      if (text.empty() || problem != std::errc() || stop != text.data() + text.size() || value > highest)
        throw bad_option(std::string(word) + " takes a whole number from 0 to " + std::to_string(highest) + ", not '" + std::string(text) + "'");
      return value;
    };
    if (word == "--help" || word == "-h")
      chosen.help = true;
    else if (word == "--seed")
      chosen.seed = number(~std::uint64_t{0});
    else if (word == "--threads")
      chosen.threads = number(4096);
    else if (word.starts_with("-"))
      throw bad_option("there is no option " + std::string(word));
    else if (!chosen.readings.empty())
      throw bad_option("two files of readings are given; one is needed");
    else
      chosen.readings = word;
  }
  if (chosen.readings.empty() && !chosen.help) throw bad_option("a file of readings is needed");
  return chosen;
}

std::string text(char const* format, double value) {
  char room[64];
  std::snprintf(room, sizeof room, format, value);
  return room;
}
std::string short_text(double value) { return text("%.2g", value); }

/// Refuses readings that no mooring drawn before them comes near.
template <class Sample>
void refuse_no_fit(Sample const& before, mooring::occasion const& read, mooring::csv_file const& file) {
  double nearest = 1e300;
  for (double const load : before.values([&](state const& s) { return mooring::steady_load(s, read.wind); }, true))
    nearest = std::min(nearest, std::abs(load - read.load));
  if (nearest > 3.0 * mooring::cell_sd)
    throw mooring::bad_file(file.at(read.line) + "no mooring comes within " + short_text(nearest) +
                            " kN of this reading; check it, and what is taken for granted of the barge");
}

int answer(options const& chosen) {
  mooring::csv_file const file(chosen.readings);
  mooring::readings const read = mooring::readings_from(file);
  auto const cell = [](char const* name, mooring::occasion const& o) {
    return sy::reading(name, o.load, [wind = o.wind](state const& s) { return mooring::steady_load(s, wind); },
                       sy::normal_noise(mooring::cell_sd));
  };
  sy::pipeline const pipe{&mooring::simulate, sy::together(cell("still air", read.still), cell("steady wind", read.windy))};
  auto const threads = static_cast<unsigned>(chosen.threads);
  auto const over = [](double load) { return [load](state const& s) { return s.peak - load; }; };
  auto const peak_over = [](double load) { return [load](state const& s) { return s.peak > load; }; };
  constexpr double often = 500.0;  // kN: seen by plain weighting as well

  auto const plain = pipe.run({.size = 200'000, .seed = chosen.seed, .threads = threads});
  refuse_no_fit(plain, read.still, file);
  refuse_no_fit(plain, read.windy, file);
  auto const seen = plain.probability(peak_over(mooring::rated_load)), seen_often = plain.probability(peak_over(often));

  sy::tempered_plan how;
  how.seed = chosen.seed;
  how.threads = threads;
  how.chains = 300;
  // Words 0 to 2 are the mooring, 3 to 5 the weather, the others the sea: each a block that moves on its own too.
  sy::refresh_together const line{0, 3}, weather{3, 3}, sea{6, 2 * mooring::components};
  auto const chance = sy::low_probability(pipe, over(mooring::rated_load), how, line, weather, sea);
  auto const chance_often = sy::low_probability(pipe, over(often), how, line, weather, sea);
  sy::interval const between = chance.error_interval(0.95);

  std::ostream& out = std::cout;
  out << "A barge on its moorings before a storm (all of it invented)\n\n"
      << "Read from " << file.path() << ", load cell within " << mooring::cell_sd << " kN (standard deviation):\n"
      << "  still air:               " << text("%.1f", read.still.load) << " kN at " << text("%.1f", read.still.wind) << " m/s\n"
      << "  steady wind:             " << text("%.1f", read.windy.load) << " kN at " << text("%.1f", read.windy.wind) << " m/s\n\n"
      << "Plain weighting, " << plain.sampler_calls() << " simulated storms:\n"
      << "  " << to_string(plain.diagnosis()) << '\n'
      << "  chance of more than " << mooring::rated_load << " kN: " << seen << "\n\n"
      << "The same simulator and readings by rising levels, " << chance.sampler_calls() << " simulated storms:\n"
      << "  chance of more than " << mooring::rated_load << " kN: " << short_text(chance.value) << " +- " << short_text(chance.standard_error)
      << " (" << to_string(chance.verdict()) << "); 95 % error interval " << short_text(between.lower) << " to " << short_text(between.upper)
      << '\n'
      << "  " << to_string(chance.diagnosis()) << '\n';
  if (chance.verdict() != sy::verdict::broken) {
    double const worth = plain.diagnosis().effective_size() / static_cast<double>(plain.drawn());
    double const cv = chance.standard_error / chance.value, asked = 1.0 / (chance.value * cv * cv * worth);
    out << "  Plain weighting would need about " << short_text(asked) << " storms for the same error: "
        << short_text(asked / static_cast<double>(chance.sampler_calls())) << " times as many.\n\n"
        << "Ten storms that would do it, as likely as each other:\n"
        << "  waves m  period s  wind m/s  pretension kN  stiffness kN/m  peak kN  after s  slack %\n";
    auto const ten = chance.sample().resample(10, {.seed = chosen.seed});
    for (state const& s : ten)
      out << text("%9.2f", s.wave_height) << text("%10.1f", s.period) << text("%10.1f", s.wind) << text("%15.1f", s.pretension)
          << text("%16.0f", s.stiffness) << text("%9.0f", s.peak) << text("%9.0f", s.when) << text("%9.0f", 100.0 * s.slack) << '\n';
  }
  out << "\nBoth ways for a load that both can see, more than " << often << " kN:\n  plain " << seen_often << "\n  levels "
      << static_cast<sy::estimate const&>(chance_often) << '\n';
  double const apart = std::abs(seen_often.value - chance_often.value), reach = std::hypot(seen_often.standard_error, chance_often.standard_error);
  bool const agree = seen_often.verdict() != sy::verdict::broken && apart <= 5.0 * reach;
  out << (agree ? "  They agree.\n\n" : "  They do not agree: something is wrong.\n\n")
      << "The error bars speak of the number of storms simulated alone. All of it takes for granted that the barge moves in\n"
         "surge only, that two minutes stand for the storm, that the line is a spring without creep or wear, that the\n"
         "spectrum has its usual shape, and that the wave heights of storms are known: the chance of rare storms above all\n"
         "rests on tails that no reading here has tested. Use it to compare, not to certify.\n";
  return agree ? 0 : 1;
}

}  // namespace

int main(int argc, char** argv) {
  try {
    options const chosen = options_from(argc, argv);
    if (!chosen.help) return answer(chosen);
    std::cout << usage;
    return 0;
  } catch (bad_option const& problem) {
    std::cerr << "mooring: " << problem.what() << "; --help shows what there is\n";
    return 2;
  } catch (std::exception const& problem) {
    std::cerr << "mooring: " << problem.what() << '\n';
    return 1;
  }
}
