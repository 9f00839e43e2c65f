// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstdint>
#include <span>

#include <steelyard/base/isa.hpp>
#include <steelyard/draw/philox.hpp>
#include <steelyard/draw/philox_blocks.hpp>
#include <steelyard/draw/purpose.hpp>

namespace steelyard::inline v1::detail {

/// Words of blocks first_block, first_block + 1, ... of one stream, in order.
/// @pre out holds whole blocks: a multiple of 4 words
inline void stream_words(std::uint64_t seed, std::uint64_t stream, purpose what, std::uint64_t round,
                         std::uint64_t first_block, std::span<std::uint64_t> out) noexcept {
  std::uint64_t const blocks = out.size() / 4;
  make_blocks<along::blocks>(
      blocks < 8 ? isa::plain : widest_isa(),
      {{first_block, stream, static_cast<std::uint64_t>(what), round}, seed, out.data(), 4, blocks});
}

/// The first 4 * n_blocks words of `n_streams` consecutive streams, one stream
/// after another: what a run hands its samples before they draw.
/// @pre out.size() == 4 * n_blocks * n_streams
/// Cost  6.5 ns a block with 512-bit vectors, else 8.5 ns.
inline void first_words(std::uint64_t seed, purpose what, std::uint64_t round, std::uint64_t first_stream,
                        std::uint64_t n_streams, std::uint64_t n_blocks, std::span<std::uint64_t> out,
                        isa width = widest_isa()) noexcept {
  for (std::uint64_t block = 0; block < n_blocks; ++block)
    make_blocks<along::streams>(width, {{block, first_stream, static_cast<std::uint64_t>(what), round},
                                        seed,
                                        out.data() + 4 * block,
                                        4 * n_blocks,
                                        n_streams});
}

}  // namespace steelyard::inline v1::detail
