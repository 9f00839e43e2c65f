// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <iosfwd>
#include <string>
#include <utility>

namespace steelyard::inline v1::proof {

/// What a check came to.
enum class outcome {
  passed,
  failed,
  cannot_certify,  ///< too little to tell at the stated false-alarm rate
};

/// A check for a unit test: true only where it passed, and one sentence either way.
class check {
 public:
  check(outcome what, std::string sentence) : outcome_(what), sentence_(std::move(sentence)) {}

  [[nodiscard]] explicit operator bool() const noexcept { return outcome_ == outcome::passed; }
  [[nodiscard]] proof::outcome result() const noexcept { return outcome_; }
  [[nodiscard]] std::string const& sentence() const noexcept { return sentence_; }

 private:
  proof::outcome outcome_;
  std::string sentence_;
};

[[nodiscard]] inline std::string to_string(check const& c) { return c.sentence(); }

template <class Char, class Traits>
std::basic_ostream<Char, Traits>& operator<<(std::basic_ostream<Char, Traits>& out, check const& c) {
  return out << c.sentence().c_str();
}

}  // namespace steelyard::inline v1::proof
