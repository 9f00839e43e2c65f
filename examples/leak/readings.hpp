// SPDX-License-Identifier: BSL-1.0
#pragma once

// What the readings file must hold: a row for each of two pressure loggers and for the make-up water meter.
//   instrument,position_m,reading,unit
//   logger 1,450,566.1,kPa
// Positions run from the plant. A reading outside its instrument's scale is a wrong reading or a wrong unit.

#include <array>
#include <charconv>
#include <cstddef>
#include <string>
#include <string_view>

#include "csv.hpp"

namespace leak {

inline constexpr double length = 1200.0;  // m, from the plant to the consumers

struct instrument_row {
  double position;   // m from the plant
  double value;      // in the instrument's unit
  std::size_t line;  // of the file
};

struct readings {
  instrument_row logger_1, logger_2, meter;
};

namespace detail {

struct instrument_scale {
  std::string_view name, unit;
  double lowest, highest;
};
inline constexpr std::array<instrument_scale, 3> instruments{
    {{"logger 1", "kPa", 0.0, 1000.0}, {"logger 2", "kPa", 0.0, 1000.0}, {"make-up meter", "L/s", 0.0, 10.0}}};

/// The shortest text that reads back as the number.
inline std::string shortest(double value) {
  char text[32];
  return {text, std::to_chars(text, text + sizeof text, value).ptr};
}

inline std::string listed() {
  std::string names;
  for (instrument_scale const& each : instruments)
    names += (names.empty() ? "'" : ", '") + std::string(each.name) + "'";
  return names;
}

}  // namespace detail

/// @throws bad_file with one sentence that names the file and the line
inline readings readings_from(csv_file const& file) {
  using detail::shortest;
  std::size_t const name = file.column("instrument"), position = file.column("position_m"),
                    value = file.column("reading"), unit = file.column("unit");
  std::array<instrument_row, detail::instruments.size()> found{};
  for (csv_file::row const& row : file.rows()) {
    std::size_t which = 0;
    while (which < found.size() && detail::instruments[which].name != row.fields[name]) ++which;
    if (which == found.size())
      throw bad_file(file.at(row.line) + "there is no instrument '" + row.fields[name] + "'; known are " +
                     detail::listed());
    detail::instrument_scale const& scale = detail::instruments[which];
    std::string const what = std::string(scale.name);
    if (found[which].line != 0)
      throw bad_file(file.at(row.line) + what + " was read already in line " + std::to_string(found[which].line));
    if (row.fields[unit] != scale.unit)
      throw bad_file(file.at(row.line) + what + " reads in " + std::string(scale.unit) + ", not in '" +
                     row.fields[unit] + "'");
    found[which] = {file.number(row, position), file.number(row, value), row.line};
    if (!(found[which].position >= 0.0 && found[which].position <= length))
      throw bad_file(file.at(row.line) + "a position of " + shortest(found[which].position) +
                     " m is off the main, which is " + shortest(length) + " m long");
    if (!(found[which].value >= scale.lowest && found[which].value <= scale.highest))
      throw bad_file(file.at(row.line) + "a reading of " + shortest(found[which].value) + " is off the scale of " +
                     what + ", which runs from " + shortest(scale.lowest) + " to " + shortest(scale.highest) + " " +
                     std::string(scale.unit));
  }
  for (std::size_t which = 0; which < found.size(); ++which)
    if (found[which].line == 0)
      throw bad_file(file.path() + ": there is no row for '" + std::string(detail::instruments[which].name) + "'");
  return {found[0], found[1], found[2]};
}

}  // namespace leak
