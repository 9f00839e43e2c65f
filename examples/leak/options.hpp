// SPDX-License-Identifier: BSL-1.0
#pragma once

// The command line of the example.

#include <charconv>
#include <cstdint>
#include <stdexcept>
#include <string>
#include <string_view>
#include <system_error>

namespace leak {

struct options {
  std::string readings;
  std::string states = "leak_states.csv";
  std::uint64_t samples = 1'000'000;
  std::uint64_t seed = 1;
  std::uint64_t threads = 1;
  bool check = false;
  bool help = false;
};

inline constexpr std::string_view usage =
    "leak [options] READINGS: where a district-heating main loses water, from two pressure loggers and a meter.\n"
    "  --readings FILE  the readings, as a CSV file (the same as giving the file alone)\n"
    "  --states FILE    where 200 states for follow-on runs go (default: leak_states.csv)\n"
    "  --samples N      how many states to draw (default: 1000000)\n"
    "  --seed N         which random numbers; the same seed gives the same answer (default: 1)\n"
    "  --threads N      on so many threads, 0 for all cores; the answer is the same (default: 1)\n"
    "  --check          also compare the answer with the true state in the file and with a quadrature\n"
    "  --help           this text\n"
    "Returns 0, 1 where a file or the answer is wrong, 2 where the command line is.\n";

/// A command line that makes no sense, as one sentence.
class bad_option : public std::runtime_error {
 public:
  using std::runtime_error::runtime_error;
};

inline options options_from(int count, char const* const* words) {
  options chosen;
  for (int i = 1; i < count; ++i) {
    std::string_view const word = words[i];
    auto const next = [&]() -> std::string_view {
      if (i + 1 >= count || words[i + 1][0] == '\0') throw bad_option(std::string(word) + " needs a value");
      return words[++i];
    };
    auto const number = [&](std::uint64_t lowest, std::uint64_t highest) {
      std::string_view const text = next();
      std::uint64_t value = 0;
      auto const [stop, problem] = std::from_chars(text.data(), text.data() + text.size(), value);
      if (problem != std::errc() || stop != text.data() + text.size() || value < lowest || value > highest)
        throw bad_option(std::string(word) + " takes a whole number from " + std::to_string(lowest) + " to " +
                         std::to_string(highest) + ", not '" + std::string(text) + "'");
      return value;
    };
    auto const file = [&](std::string_view path) {
      if (!chosen.readings.empty()) throw bad_option("two files of readings are given; one is needed");
      chosen.readings = path;
    };
    if (word == "--help" || word == "-h")
      chosen.help = true;
    else if (word == "--check")
      chosen.check = true;
    else if (word == "--readings")
      file(next());
    else if (word == "--states")
      chosen.states = next();
    else if (word == "--samples")
      chosen.samples = number(1, 1'000'000'000);
    else if (word == "--seed")
      chosen.seed = number(0, ~std::uint64_t{0});
    else if (word == "--threads")
      chosen.threads = number(0, 4096);
    else if (word.starts_with("-"))
      throw bad_option("there is no option " + std::string(word));
    else
      file(word);
  }
  if (chosen.readings.empty() && !chosen.help) throw bad_option("a file of readings is needed");
  return chosen;
}

}  // namespace leak
