// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstdint>
#include <exception>
#include <stdexcept>
#include <string>

namespace steelyard::inline v1 {

/// Root of everything this library throws: one sentence that names the
/// function, the sample, the value and the rule that was broken.
class error : public std::runtime_error {
 public:
  explicit error(std::string const& sentence) : std::runtime_error(sentence) {}
};

/// An argument outside what is allowed: a plan, an edge, a level, a length.
class bad_argument : public error {
 public:
  using error::error;
};

/// A likelihood, log-likelihood or prior weight that is not a number, is
/// negative or is infinite.
class bad_weight : public error {
 public:
  using error::error;
};

/// A readout that is not a finite number at a state of positive weight.
class bad_readout : public error {
 public:
  using error::error;
};

/// No sample has any likelihood: there is nothing to answer from.
class no_likelihood : public error {
 public:
  using error::error;
};

/// States were asked for that this sample did not keep.
class not_kept : public error {
 public:
  using error::error;
};

/// A reading was named that the sample does not have, or named twice.
class bad_name : public error {
 public:
  using error::error;
};

/// A sampler that returns something else when the same words are replayed.
class hidden_state : public error {
 public:
  using error::error;
};

/// A stop that was asked for before the first round was done.
class stopped_early : public error {
 public:
  using error::error;
};

/// A checkpoint of another version, plan or length, or a damaged one.
class bad_checkpoint : public error {
 public:
  using error::error;
};

/// A user's function threw, or a sampler returned no state. The original is
/// nested (`std::rethrow_if_nested`); its words are part of `what()`.
class failed_sample : public error, public std::nested_exception {
 public:
  failed_sample(std::string const& sentence, std::uint64_t index)
      : error(sentence), std::nested_exception(), index_(index) {}

  /// Number of the sample, the lowest that failed whatever the threads:
  /// `pipe.replay(plan, index)` meets the same failure again.
  [[nodiscard]] std::uint64_t index() const noexcept { return index_; }

 private:
  std::uint64_t index_;
};

}  // namespace steelyard::inline v1
