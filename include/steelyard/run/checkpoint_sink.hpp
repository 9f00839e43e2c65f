// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <span>
#include <vector>

namespace steelyard::inline v1 {

/// Where a run leaves its state at round ends, and finds it when taken up
/// again: bytes out and in. `write` replaces what was there as a whole.
class checkpoint_sink {
 public:
  checkpoint_sink() = default;
  checkpoint_sink(checkpoint_sink const&) = delete;
  checkpoint_sink& operator=(checkpoint_sink const&) = delete;
  virtual ~checkpoint_sink() = default;

  virtual void write(std::span<std::byte const> bytes) = 0;
  /// The bytes last written; empty where there are none.
  [[nodiscard]] virtual std::vector<std::byte> read() = 0;
};

}  // namespace steelyard::inline v1
