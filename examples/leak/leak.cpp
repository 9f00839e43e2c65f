// SPDX-License-Identifier: BSL-1.0
// A district-heating main loses hot water somewhere on 1200 m. Two pressure loggers and the make-up water meter were
// read: where is the leak, and how large? The network and the readings are invented.

#include <algorithm>
#include <array>
#include <chrono>
#include <cmath>
#include <cstddef>
#include <exception>
#include <filesystem>
#include <iostream>
#include <string>
#include <system_error>
#include <utility>
#include <vector>

#include <steelyard/steelyard.hpp>

#include "check.hpp"
#include "csv.hpp"
#include "model.hpp"
#include "options.hpp"
#include "page.hpp"
#include "readings.hpp"

namespace sy = steelyard;
using leak::fixed;
using leak::wrapped;

namespace {

constexpr std::size_t sections = 12;
constexpr std::size_t bar_width = 32;

/// The neighbouring sections, as few as possible, that hold a share of the chance: first and one past the last.
std::pair<std::size_t, std::size_t> where_to_search(sy::histogram_result const& where, double share) {
  for (std::size_t size = 1; size < sections; ++size) {
    double best = 0.0;
    std::size_t at = 0;
    for (std::size_t first = 0; first + size <= sections; ++first) {
      double sum = 0.0;
      for (std::size_t b = first; b < first + size; ++b) sum += where.probability(b).value;
      if (sum > best) best = sum, at = first;
    }
    if (best >= share) return {at, at + size};
  }
  return {0, sections};
}

void print_sections(std::ostream& out, sy::histogram_result const& before, sy::histogram_result const& after) {
  double most_before = 0.0, most_after = 0.0;
  for (std::size_t b = 0; b < sections; ++b) {
    most_before = std::max(most_before, before.probability(b).value);
    most_after = std::max(most_after, after.probability(b).value);
  }
  double const full = 1.1 * std::max(most_before, most_after);
  auto const room = static_cast<std::size_t>(std::ceil(1.1 * static_cast<double>(bar_width) * most_before / full)) + 2;
  std::string const title = "before the readings";
  std::size_t const column = std::max(room + 17, title.size() + 2);
  out << wrapped("Chance in percent that the leak lies in each 100 m, with its standard error. A bar is filled up to "
                 "the lower end of the 95 % error interval and dashed on to the upper end.")
      << "\n      metres     " << title << std::string(column - title.size(), ' ') << "after them\n";
  for (std::size_t b = 0; b < sections; ++b) {
    std::string const from = fixed(before.edge(b), 0), to = fixed(before.edge(b + 1), 0);
    sy::estimate const &prior = before.probability(b), &answer = after.probability(b);
    std::string line =
        "  " + std::string(4 - from.size(), ' ') + from + " to " + std::string(4 - to.size(), ' ') + to + "   " +
        leak::on_point(leak::percent(prior), 2, 17) + leak::bar(prior, full, bar_width).substr(0, column - 17) +
        leak::on_point(leak::percent(answer), 3, 17) +
        (answer.verdict() == sy::verdict::broken ? std::string(bar_width, ' ') : leak::bar(answer, full, bar_width));
    if (answer.verdict() != sy::verdict::sound) line += "  " + std::string(to_string(answer.verdict()));
    out << line.substr(0, line.find_last_not_of(' ') + 1) << '\n';
  }
}

/// A chance of several sections together.
template <class Sample>
sy::estimate chance_of(Sample const& sample, std::vector<std::size_t> const& chosen) {
  std::array<bool, sections> holds{};
  for (std::size_t const each : chosen) holds[each] = true;
  return sample.probability([holds](leak::state const& s) {
    return holds[std::min(sections - 1, static_cast<std::size_t>(s.position / leak::section))];
  });
}

/// Which of the answers are not to be believed, in sentences.
template <class Sample>
void print_doubts(std::ostream& out, Sample const& sample, sy::histogram_result const& where,
                  std::vector<std::pair<std::string, sy::verdict>> const& others) {
  auto const with = [&](sy::verdict asked) {
    std::vector<std::size_t> chosen;
    for (std::size_t b = 0; b < sections; ++b)
      if (where.probability(b).verdict() == asked) chosen.push_back(b);
    return chosen;
  };
  auto const together = [&](std::vector<std::size_t> const& chosen) {
    if (chosen.size() < 2 || chosen.size() == sections) return std::string();
    sy::estimate const sum = chance_of(sample, chosen);
    return sum.verdict() == sy::verdict::broken
               ? std::string()
               : " Together they hold " + leak::percent(sum) + " % (" + std::string(to_string(sum.verdict())) + ").";
  };
  std::vector<std::size_t> const strained = with(sy::verdict::strained), broken = with(sy::verdict::broken);
  std::string some, none;
  for (auto const& [name, verdict] : others) {
    if (verdict == sy::verdict::strained) some += (some.empty() ? "" : ", ") + name;
    if (verdict == sy::verdict::broken) none += (none.empty() ? "" : ", ") + name;
  }
  if (strained.empty() && broken.empty() && some.empty() && none.empty())
    out << "All of the numbers above are sound.\n";
  if (!broken.empty())
    out << wrapped("Broken, not to be believed: the chance of each section in " + leak::stretches(broken) +
                   "; a handful of states or none carries it." + together(broken));
  if (!strained.empty())
    out << wrapped("Strained, orders of magnitude only: the chance of each section in " + leak::stretches(strained) +
                   "; few states carry it." + together(strained));
  if (!none.empty()) out << wrapped("Broken as well: " + none + ".");
  if (!some.empty()) out << wrapped("Strained as well: " + some + ".");
}

/// Refuses before the run what would be lost after it.
void refuse_paths(leak::options const& chosen) {
  std::error_code ignored;
  if (std::filesystem::equivalent(chosen.readings, chosen.states, ignored))
    throw leak::bad_option("the states would overwrite the readings in " + chosen.readings);
}

auto weighter_for(leak::readings const& read, leak::csv_file const& file) {
  try {
    return leak::weigh_by(read);
  } catch (sy::bad_argument const& problem) {
    throw leak::bad_file(file.path() + ": " + problem.what());
  }
}

/// Refuses to answer where hardly any state explains the readings, and says which reading no state comes near.
template <class Sample>
void refuse_no_fit(Sample const& sample, leak::readings const& read, leak::csv_file const& file) {
  if (sample.diagnosis().verdict() != sy::verdict::broken) return;
  auto const far_from = [&](std::string const& name, leak::instrument_row const& row, auto const& readout, double sd,
                            char const* unit) {
    double nearest = 1e300;
    for (double const value : sample.values(readout, true)) nearest = std::min(nearest, std::abs(value - row.value));
    if (nearest > 3.0 * sd)
      throw leak::bad_file(file.at(row.line) + "no state comes within " + fixed(nearest, 1) + ' ' + unit + " of what " +
                           name + " reads; check it, and what is taken for granted of the main");
  };
  auto const pressure_at = [](double x) { return [x](leak::state const& s) { return s.pressure_at(x); }; };
  far_from("logger 1", read.logger_1, pressure_at(read.logger_1.position), leak::logger_sd, "kPa");
  far_from("logger 2", read.logger_2, pressure_at(read.logger_2.position), leak::logger_sd, "kPa");
  far_from("the make-up meter", read.meter, &leak::state::leak_flow, leak::meter_sd, "L/s");
  throw leak::bad_file(file.path() + ": hardly any state explains these readings together: " +
                       std::to_string(sample.drawn()) + " are worth " + fixed(sample.diagnosis().effective_size(), 1) +
                       " equal ones, too few for an answer; check the readings, or draw more with --samples");
}

int answer(leak::options const& chosen) {
  leak::csv_file const file(chosen.readings);
  leak::readings const read = leak::readings_from(file);
  refuse_paths(chosen);

  auto const start = std::chrono::steady_clock::now();
  sy::pipeline const pipe{&leak::simulate, weighter_for(read, file)};
  auto const sample =
      pipe.run({.size = chosen.samples, .seed = chosen.seed, .threads = static_cast<unsigned>(chosen.threads)});
  refuse_no_fit(sample, read, file);
  auto const over_2 = [](leak::state const& s) { return s.leak_flow > 2.0; };
  auto const by_section = sy::histogram(&leak::state::position, sy::equal_bins(0.0, leak::length, sections));
  auto const [where, over, flow, between, evidence] =
      sample.estimate(by_section, sy::probability(over_2), sy::expectation(&leak::state::leak_flow),
                      sy::coverage_interval(&leak::state::leak_flow, 0.95), sy::log_evidence());
  auto const [where_before, over_before] = sample.before().estimate(by_section, sy::probability(over_2));
  auto const states = sample.resample(200, {.seed = chosen.seed});
  std::chrono::duration<double> const spent = std::chrono::steady_clock::now() - start;
  leak::write_whole(chosen.states, leak::states_file(sample, states));

  std::ostream& out = std::cout;
  out << "A leak in a district-heating main of " << fixed(leak::length, 0) << " m (the network is invented)\n\n"
      << "Read from " << file.path() << ":\n"
      << "  logger 1, " << fixed(read.logger_1.position, 0) << " m from the plant: " << fixed(read.logger_1.value, 1)
      << " kPa\n"
      << "  logger 2, " << fixed(read.logger_2.position, 0) << " m from the plant: " << fixed(read.logger_2.value, 1)
      << " kPa\n"
      << "  make-up meter: " << fixed(read.meter.value, 2) << " L/s\n"
      << "The loggers display to " << fixed(leak::display_step, 1) << " kPa and err by " << fixed(leak::logger_sd, 1)
      << " kPa, the meter by " << fixed(leak::meter_sd, 2) << " L/s (standard deviations).\n\n"
      << sample.drawn() << " states drawn, weighed and asked in " << fixed(spent.count(), 1) << " s.\n\n";

  print_sections(out, where_before, where);
  auto const [first, last] = where_to_search(where, 0.9);
  std::vector<std::size_t> search;
  for (std::size_t b = first; b < last; ++b) search.push_back(b);
  out << '\n'
      << wrapped("Search " + leak::stretches(search) +
                 " first: the fewest neighbouring sections that hold 90 %. They hold " +
                 leak::percent(chance_of(sample, search)) + " %.")
      << '\n'
      << wrapped("The leak loses " + leak::with_error(flow) + " L/s on average. Its 95 % coverage interval runs from " +
                 leak::with_error(between.lower) + " to " + leak::with_error(between.upper) +
                 " L/s. The chance that it exceeds 2 L/s is " + leak::percent(over) +
                 " %; before the readings it was " + leak::percent(over_before) + " %.")
      << '\n'
      << wrapped("The log-evidence of the readings is " + leak::with_error(evidence) +
                 ": to be compared with that of other assumptions about the same readings.")
      << wrapped(std::to_string(states.size()) + " equally likely states for follow-on runs are in " + chosen.states +
                 ".")
      << "\nCan this be believed?\n"
      << wrapped(to_string(sample.diagnosis()));
  print_doubts(out, sample, where,
               {{"the mean leak flow", flow.verdict()},
                {"the lower end of its interval", between.lower.verdict()},
                {"the upper end of its interval", between.upper.verdict()},
                {"the chance of more than 2 L/s", over.verdict()},
                {"the log-evidence", evidence.verdict()}});
  out << wrapped(
      "The error bars speak of the number of states alone. All answers take for granted that there is one leak, that "
      "the main is level and of one diameter, that the flow is steady, and that the instruments err as stated above.");
  if (!chosen.check) return 0;
  out << '\n';
  return leak::check(sample, read, file, out) ? 0 : 1;
}

}  // namespace

int main(int argc, char** argv) {
  try {
    leak::options const chosen = leak::options_from(argc, argv);
    if (!chosen.help) return answer(chosen);
    std::cout << leak::usage;
    return 0;
  } catch (leak::bad_option const& problem) {
    std::cerr << "leak: " << problem.what() << "; --help shows what there is\n";
    return 2;
  } catch (std::exception const& problem) {
    std::cerr << "leak: " << problem.what() << '\n';
    return 1;
  }
}
