// SPDX-License-Identifier: BSL-1.0
#pragma once

// What the example prints, and the file of states it writes.

#include <algorithm>
#include <cmath>
#include <cstddef>
#include <cstdio>
#include <filesystem>
#include <fstream>
#include <ostream>
#include <sstream>
#include <string>
#include <system_error>
#include <utility>
#include <vector>

#include "model.hpp"

namespace leak {

inline std::string fixed(double value, int decimals) {
  char text[64];
  std::snprintf(text, sizeof text, "%.*f", decimals, value);
  return text;
}

/// A text in lines of at most 100 characters, each ended. Its own line ends stay; "8.5 +- 0.6 %" is not broken.
inline std::string wrapped(std::string const& text) {
  std::string all;
  std::size_t column = 0;
  std::istringstream lines(text);
  for (std::string line; std::getline(lines, line); column = 0, all += '\n') {
    std::istringstream words(line);
    std::string next;
    words >> next;
    while (!next.empty()) {
      std::string word = std::exchange(next, std::string());
      while (words >> next && (next == "+-" || next.starts_with('%') || word.ends_with("+-"))) {
        word += ' ' + next;
        next.clear();
      }
      bool const fits = column == 0 || column + 1 + word.size() <= 100;
      if (column > 0) all += fits ? ' ' : '\n';
      column = (fits && column > 0 ? column + 1 : 0) + word.size();
      all += word;
    }
  }
  return all;
}

/// Decimals that show two digits of an error.
inline int decimals_for(double error) {
  return error > 0.0 ? std::clamp(1 - static_cast<int>(std::floor(std::log10(error))), 0, 9) : 3;
}

/// "35.4 +- 1.3": rounded to two digits of the standard error.
inline std::string with_error(steelyard::estimate const& e) {
  int const decimals = decimals_for(e.standard_error);
  return fixed(e.value, decimals) + " +- " + fixed(e.standard_error, decimals);
}

/// A chance in percent: with its standard error, or only that it is next to nothing or to all; where no state (every
/// state) showed it, the most (the least) that it can be.
inline std::string percent(steelyard::estimate const& chance) {
  steelyard::estimate const e = chance.scaled(100.0);
  if (e.never_seen()) return "under " + fixed(std::max(0.01, e.error_interval(0.95).upper), 2);
  if (e.always_seen()) return "over " + fixed(std::min(99.99, e.error_interval(0.95).lower), 2);
  if (e.value + 2.0 * e.standard_error < 0.01) return "under 0.01";
  if (e.value - 2.0 * e.standard_error > 99.99) return "over 99.99";
  return with_error(e);
}

/// A bar for a chance: # up to the lower end of its 95 % error interval, - on to the upper end.
inline std::string bar(steelyard::estimate const& chance, double full, std::size_t width) {
  steelyard::interval const error = chance.error_interval(0.95);
  auto const cells = [&](double p) {
    return static_cast<std::size_t>(
        std::clamp(std::lround(static_cast<double>(width) * p / full), 0L, static_cast<long>(width)));
  };
  std::size_t const sure = cells(error.lower_known ? error.lower : 0.0);
  std::size_t const most = std::max(sure, cells(error.upper_known ? error.upper : 1.0));
  return std::string(sure, '#') + std::string(most - sure, '-') + std::string(width - most, ' ');
}

/// "0 to 300 m, 400 to 500 m": sections by number, neighbours joined.
inline std::string stretches(std::vector<std::size_t> const& sections) {
  std::string text;
  for (std::size_t i = 0; i < sections.size();) {
    std::size_t last = i;
    while (last + 1 < sections.size() && sections[last + 1] == sections[last] + 1) ++last;
    text += (i == 0 ? "" : ", ") + fixed(section * static_cast<double>(sections[i]), 0) + " to " +
            fixed(section * static_cast<double>(sections[last] + 1), 0) + " m";
    i = last + 1;
  }
  return text;
}

/// Puts a text aligned on its decimal point: `before` characters in front of it, `all` in total.
inline std::string on_point(std::string const& text, std::size_t before, std::size_t all) {
  std::size_t const point = std::min(text.find_first_of(". "), text.size());
  std::string const shifted = std::string(before > point ? before - point : 0, ' ') + text;
  return shifted + std::string(all > shifted.size() ? all - shifted.size() : 0, ' ');
}

/// Writes a file under another name first, so that nobody meets half a file.
/// @throws bad_file where it cannot be written; what stood there before then still does
inline void write_whole(std::string const& path, std::string const& text) {
  std::string const part = path + ".part";
  std::error_code problem;
  {
    std::ofstream out(part, std::ios::binary | std::ios::trunc);
    out << text << std::flush;
    if (!out) {
      out.close();
      std::filesystem::remove(part, problem);
      throw bad_file(path + ": the states cannot be written there");
    }
  }
  std::filesystem::rename(part, path, problem);
  if (problem) {
    std::string const reason = problem.message();
    std::filesystem::remove(part, problem);
    throw bad_file(path + ": the states cannot be written there (" + reason + ")");
  }
}

/// Equally weighted states for follow-on runs, a row each; `sample` is the number of the stream that drew the state.
template <class Sample, class Ensemble>
std::string states_file(Sample const& sample, Ensemble const& chosen) {
  std::ostringstream out;
  out.precision(9);
  out << "sample,position_m,opening_cm2,roughness_mm,demand_L_per_s,inlet_pressure_kPa,leak_flow_L_per_s\n";
  for (std::size_t slot = 0; slot < chosen.size(); ++slot) {
    state const& s = chosen[slot];
    out << sample.sample_index(chosen.indices()[slot]) << ',' << s.position << ',' << s.opening << ',' << s.roughness
        << ',' << s.demand << ',' << s.inlet_pressure << ',' << s.leak_flow << '\n';
  }
  return out.str();
}

}  // namespace leak
