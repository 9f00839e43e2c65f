// SPDX-License-Identifier: BSL-1.0
#pragma once

// What the readings file must hold: the load of the head line in still air and in a steady wind, on a calm sea.
//   occasion,wind_m_per_s,reading,unit
//   still air,0.0,163.4,kN

#include <array>
#include <cstddef>
#include <sstream>
#include <string>
#include <string_view>

#include "../leak/csv.hpp"

namespace mooring {

using leak::bad_file;
using leak::csv_file;

inline constexpr double cell_sd = 1.5;  // kN, of the load cell

struct occasion {
  double wind = 0.0;     // m/s
  double load = 0.0;     // kN
  std::size_t line = 0;  // of the file
};
struct readings {
  occasion still, windy;
};

inline std::string plain(double value) {
  std::ostringstream text;
  text << value;
  return text.str();
}

/// @throws bad_file with one sentence that names the file and the line
inline readings readings_from(csv_file const& file) {
  std::array<std::string_view, 2> const names{"still air", "steady wind"};
  std::size_t const name = file.column("occasion"), wind = file.column("wind_m_per_s"), load = file.column("reading"),
                    unit = file.column("unit");
  std::array<occasion, 2> found{};
  for (csv_file::row const& row : file.rows()) {
    std::size_t which = 0;
    while (which < names.size() && names[which] != row.fields[name]) ++which;
    if (which == names.size())
      throw bad_file(file.at(row.line) + "there is no occasion '" + row.fields[name] + "'; known are 'still air', 'steady wind'");
    std::string const what(names[which]);
    if (found[which].line != 0)
      throw bad_file(file.at(row.line) + "'" + what + "' was read already in line " + std::to_string(found[which].line));
    if (row.fields[unit] != "kN") throw bad_file(file.at(row.line) + "the load cell reads in kN, not in '" + row.fields[unit] + "'");
    found[which] = {file.number(row, wind), file.number(row, load), row.line};
    if (!(found[which].wind >= 0.0 && found[which].wind <= 40.0))
      throw bad_file(file.at(row.line) + "a wind of " + plain(found[which].wind) + " m/s is outside 0 to 40 m/s, for which this is made");
    if (!(found[which].load >= 0.0 && found[which].load <= 4000.0))
      throw bad_file(file.at(row.line) + "a reading of " + plain(found[which].load) + " is off the scale of the load cell, 0 to 4000 kN");
  }
  for (std::size_t which = 0; which < found.size(); ++which)
    if (found[which].line == 0) throw bad_file(file.path() + ": there is no row for '" + std::string(names[which]) + "'");
  if (!(found[0].wind < found[1].wind))
    throw bad_file(file.at(found[1].line) + "the steady wind must be stronger than the wind in line " + std::to_string(found[0].line));
  return {found[0], found[1]};
}

}  // namespace mooring
