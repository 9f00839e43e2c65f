// SPDX-License-Identifier: BSL-1.0
#pragma once

// Reads the small tables under tests/data: lines of numbers and words with commas
// between, a head line with names, comments that begin with #.

#include <cstddef>
#include <fstream>
#include <sstream>
#include <stdexcept>
#include <string>
#include <vector>

namespace published {

struct table {
  std::vector<std::string> names;
  std::vector<std::vector<std::string>> rows;

  std::size_t place(std::string const& name) const {
    for (std::size_t k = 0; k < names.size(); ++k)
      if (names[k] == name) return k;
    throw std::runtime_error("no column " + name);
  }
  std::vector<double> numbers(std::string const& name) const {
    std::vector<double> all;
    for (auto const& row : rows) all.push_back(std::stod(row[place(name)]));
    return all;
  }
  std::vector<std::string> words(std::string const& name) const {
    std::vector<std::string> all;
    for (auto const& row : rows) all.push_back(row[place(name)]);
    return all;
  }
};

inline std::vector<std::string> cells(std::string const& line) {
  std::vector<std::string> all;
  std::istringstream in(line);
  for (std::string cell; std::getline(in, cell, ',');) all.push_back(cell);
  return all;
}

inline table read(std::string const& file) {
  std::ifstream in(std::string(STEELYARD_TEST_DATA) + "/" + file);
  if (!in) throw std::runtime_error("cannot read tests/data/" + file);
  table t;
  for (std::string line; std::getline(in, line);) {
    if (line.empty() || line[0] == '#') continue;
    if (t.names.empty())
      t.names = cells(line);
    else
      t.rows.push_back(cells(line));
  }
  return t;
}

}  // namespace published
