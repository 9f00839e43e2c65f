// SPDX-License-Identifier: BSL-1.0
#pragma once

// A small reader of comma-separated files, for this example only: a header line, then rows; lines that begin with # are
// comments; a field may be quoted. Everything wrong with a file is one sentence that begins with its name.

#include <algorithm>
#include <charconv>
#include <cstddef>
#include <filesystem>
#include <fstream>
#include <stdexcept>
#include <string>
#include <string_view>
#include <system_error>
#include <utility>
#include <vector>

namespace leak {

/// What is wrong with a file, as one sentence.
class bad_file : public std::runtime_error {
 public:
  using std::runtime_error::runtime_error;
};

class csv_file {
 public:
  struct row {
    std::size_t line;
    std::vector<std::string> fields;
  };

  /// @throws bad_file where there is no such file, nothing in it, or a row of another length than the header
  explicit csv_file(std::string path) : path_(std::move(path)) {
    std::error_code ignored;
    if (std::filesystem::is_directory(path_, ignored)) throw bad_file(path_ + ": this is a folder, not a file");
    std::ifstream in(path_, std::ios::binary);
    if (!in) throw bad_file(path_ + ": there is no such file, or it may not be read");
    std::string text;
    std::size_t line = 0;
    while (std::getline(in, text)) {
      ++line;
      if (line == 1 && text.starts_with("\xEF\xBB\xBF")) text.erase(0, 3);  // a byte order mark
      if (!text.empty() && text.back() == '\r') text.pop_back();
      std::string_view const trimmed = trim(text);
      if (trimmed.empty()) continue;
      if (trimmed.front() == '#') {
        comments_.emplace_back(trim(trimmed.substr(1)));
        continue;
      }
      std::vector<std::string> fields = split(text, line);
      if (header_.empty()) {
        header_ = std::move(fields);
        continue;
      }
      if (fields.size() != header_.size())
        throw bad_file(at(line) + "fields in this row: " + std::to_string(fields.size()) + ", columns in the header: " +
                       std::to_string(header_.size()) + " (a number takes a decimal point, not a comma)");
      rows_.push_back({line, std::move(fields)});
    }
    if (in.bad()) throw bad_file(path_ + ": it could not be read to its end");
    if (header_.empty()) throw bad_file(path_ + ": the file is empty; a header and a row for each instrument are due");
    if (rows_.empty()) throw bad_file(path_ + ": there is a header but no row behind it");
  }

  [[nodiscard]] std::vector<std::string> const& comments() const { return comments_; }
  [[nodiscard]] std::vector<row> const& rows() const { return rows_; }

  /// Where a column stands. @throws bad_file where it is missing or named twice, with the columns there are
  std::size_t column(std::string_view name) const {
    auto const found = std::find(header_.begin(), header_.end(), name);
    if (found == header_.end()) {
      std::string there;
      for (std::string const& each : header_) there += (there.empty() ? "'" : ", '") + each + "'";
      throw bad_file(path_ + ": the column '" + std::string(name) + "' is missing; there are " + there);
    }
    if (std::find(found + 1, header_.end(), name) != header_.end())
      throw bad_file(path_ + ": two columns are called '" + std::string(name) + "'");
    return static_cast<std::size_t>(found - header_.begin());
  }

  /// The number in a field. @throws bad_file where it is something else
  double number(row const& of, std::size_t column) const {
    std::string const& text = of.fields[column];
    double value = 0.0;
    char const* const end = text.data() + text.size();
    char const* const begin = text.data() + (text.starts_with('+') && !text.starts_with("+-") ? 1 : 0);
    auto const [stop, problem] = std::from_chars(begin, end, value);
    // "nan" and "inf" are read too, but hold no digit.
    bool const digits = std::any_of(text.begin(), text.end(), [](char c) { return c >= '0' && c <= '9'; });
    if (problem == std::errc() && stop == end && digits) return value;
    throw bad_file(at(of.line) + "'" + text + "' stands in column '" + header_[column] + "', where a number is due");
  }

  /// "readings.csv, line 8: "
  [[nodiscard]] std::string at(std::size_t line) const { return path_ + ", line " + std::to_string(line) + ": "; }
  [[nodiscard]] std::string const& path() const { return path_; }

 private:
  static std::string_view trim(std::string_view text) {
    std::size_t const first = text.find_first_not_of(" \t");
    if (first == std::string_view::npos) return {};
    return text.substr(first, text.find_last_not_of(" \t") - first + 1);
  }

  std::vector<std::string> split(std::string_view text, std::size_t line) const {
    std::vector<std::string> fields;
    for (std::size_t i = 0;;) {
      std::size_t const first = std::min(text.find_first_not_of(" \t", i), text.size());
      if (first < text.size() && text[first] == '"') {
        std::string field;
        for (i = first + 1;; ++i) {
          if (i >= text.size()) throw bad_file(at(line) + "a quotation mark is opened and not closed");
          if (text[i] != '"')
            field += text[i];
          else if (i + 1 < text.size() && text[i + 1] == '"')
            field += text[i++];
          else
            break;
        }
        i = std::min(text.find_first_not_of(" \t", i + 1), text.size());
        if (i < text.size() && text[i] != ',')
          throw bad_file(at(line) + "something stands behind a closed quotation mark");
        fields.push_back(std::move(field));
      } else {
        i = std::min(text.find(',', first), text.size());
        fields.emplace_back(trim(text.substr(first, i - first)));
      }
      if (i >= text.size()) return fields;
      ++i;
    }
  }

  std::string path_;
  std::vector<std::string> comments_;
  std::vector<std::string> header_;
  std::vector<row> rows_;
};

}  // namespace leak
