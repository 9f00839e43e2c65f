// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <array>
#include <bit>
#include <cstddef>
#include <cstdint>
#include <exception>
#include <mutex>
#include <new>
#include <span>
#include <string>
#include <utility>
#include <vector>

#include <steelyard/base/algorithm.hpp>
#include <steelyard/base/bits.hpp>
#include <steelyard/base/functional.hpp>
#include <steelyard/draw/draws.hpp>
#include <steelyard/draw/first_words.hpp>
#include <steelyard/draw/normal_words.hpp>
#include <steelyard/draw/words.hpp>
#include <steelyard/estimate/block.hpp>
#include <steelyard/estimate/user_code.hpp>
#include <steelyard/sample/origin.hpp>
#include <steelyard/weigh/concepts.hpp>
#include <steelyard/weigh/itemised.hpp>

namespace steelyard::inline v1::detail {

/// Where the words of a run come from and what becomes of its failures.
struct run_terms {
  std::uint64_t seed = 1;
  words source;
  failures on_failure = failures::stop;
};

/// Puts `d` at the start of sample i.
inline void seat_on_sample(draws& d, run_terms const& terms, std::uint64_t i) {
  if (terms.source.source() != nullptr)
    draws_access::seat(d, *terms.source.source(), terms.seed, i);
  else
    draws_access::seat(d, terms.seed, i);
}

/// What a sample consumed and came to, to be compared with a replay.
struct probe {
  std::uint64_t sample;
  std::uint64_t words;
  std::uint64_t bits;
  friend bool operator==(probe const&, probe const&) = default;
};

/// One worker's sampler and weighter: makes sample i, its scores and its log-weight.
template <class Sampler, class Weighter>
class maker {
 public:
  using state = state_of_t<Sampler>;
  static constexpr std::size_t items = item_count<Weighter>();

  maker(Sampler const& draw, Weighter const& weigh_with, run_terms const& terms)
      : sampler_(instance_of<Sampler>::make(draw)), weighter_(instance_of<Weighter>::make(weigh_with)), terms_(terms),
        draws_(terms.seed, 0) {
    largest_.fill(impossible);
  }

  /// Draws and weighs sample i, then calls take(state&&, log_weight, scores); not for a run set aside.
  template <class Take>
  void make(std::uint64_t i, Take take) {
    seat(i);
    char const* stage = "the sampler";
    bool made = false;
    try {
      auto&& drawn = detail::call(sampler_, draws_);
      if constexpr (may_be_empty) {
        if (!drawn.has_value()) {
          if (terms_.on_failure == failures::set_aside) {
            ++failed_;
            return;
          }
          throw located{i, std::make_exception_ptr(failed_sample(
                               "the sampler of sample " + std::to_string(i) + " failed: it returned no state", i))};
        }
        made = true;
        weigh(i, *std::forward<decltype(drawn)>(drawn), stage, take);
      } else {
        made = true;
        weigh(i, std::forward<decltype(drawn)>(drawn), stage, take);
      }
    } catch (std::bad_alloc const&) {
      throw_located(stage, i);
    } catch (...) {
      if (made || terms_.on_failure != failures::set_aside) throw_located(stage, i);
      ++failed_;
    }
  }

  /// What sample i comes to now: words used and bits of its log-weight; all ones where it fails.
  [[nodiscard]] probe look(std::uint64_t i) {
    probe seen{i, ~std::uint64_t{0}, ~std::uint64_t{0}};
    std::uint64_t const failed = failed_;
    try {
      make(i, [&](auto&&, double log_weight, std::span<double const>) {
        seen.words = draws_.words_used();
        seen.bits = opaque_bits(log_weight);
      });
    } catch (located const&) {
    }
    failed_ = failed;
    return seen;
  }
  [[nodiscard]] std::uint64_t words_used() const noexcept { return draws_.words_used(); }

  /// Says that samples first, first + 1, ..., first + n - 1 come next, in turn.
  void expect(std::uint64_t first, std::uint64_t n) noexcept {
    expected_first_ = first;
    expected_last_ = terms_.source.independent() ? first + n : first;
    ahead_size_ = 0;
  }

  /// Runs set aside by this worker so far, and its largest log-likelihood of each reading.
  [[nodiscard]] std::uint64_t failed() const noexcept { return failed_; }
  [[nodiscard]] std::span<double const> largest() const noexcept { return largest_; }

 private:
  static constexpr bool may_be_empty = unwrap_optional<result_t<Sampler, draws&>>::may_be_empty;
  static constexpr std::uint64_t batch = 64;       // streams whose first words are made at once
  static constexpr std::uint64_t most_ahead = 16;  // Philox blocks of each

  template <class Drawn, class Take>
  void weigh(std::uint64_t, Drawn&& drawn, char const*& stage, Take& take) {
    double row[items];
    stage = "the weighter";
    score_items(weighter_, std::as_const(drawn), std::span<double>(row));
    double total = 0.0 + row[0];
    if constexpr (items > 1) total = total_log(0.0, row);
    for (std::size_t k = 0; k < items; ++k)
      if (row[k] > largest_[k]) largest_[k] = row[k];
    stage = "a readout";
    take(std::forward<Drawn>(drawn), total, std::span<double const>(row));
  }

  /// On the start of sample i, its first words made with those of its neighbours.
  void seat(std::uint64_t i) {
    std::uint64_t const at = i - ahead_first_;
    if (at < ahead_size_)
      draws_access::move_on(draws_, i, words_.data() + at * words_each_, words_each_, normals_ahead_);
    else
      seat_afresh(i);
  }
#if defined(__GNUC__)
  [[gnu::noinline]]
#endif
  void seat_afresh(std::uint64_t i) {
    std::uint64_t const used = (draws_.words_used() + 3) / 4;
    seat_on_sample(draws_, terms_, i);
    if (i < expected_first_ || i >= expected_last_) return;
    std::uint64_t const known = words_each_ / 4, blocks = used > known ? (used < most_ahead ? used : most_ahead) : known;
    std::uint64_t const n = expected_last_ - i < batch ? expected_last_ - i : batch;
    std::size_t const each = static_cast<std::size_t>(blocks * 4);
    lay_out(each, draws_access::normal_places(draws_));
    first_words(terms_.seed, purpose::run, 0, i, n, blocks, std::span(words_).first(static_cast<std::size_t>(n) * each));
    if (normals_ahead_ != 0) make_normals(static_cast<std::size_t>(n));
    ahead_first_ = i;
    ahead_size_ = n;
    draws_access::move_on(draws_, i, words_.data(), words_each_, normals_ahead_);
  }
  /// Room for the words of a batch, and as much behind for the normal deviates of those places where the sampler asked for
  /// one before; 0 at the others.
  void lay_out(std::size_t each, std::uint64_t places) {
    if (each == words_each_ && places == normal_places_ && !words_.empty()) return;
    words_each_ = each;
    normal_places_ = places;
    normals_ahead_ = places == 0 ? 0 : batch * each;
    words_.assign(batch * each + normals_ahead_, 0);
  }
  void make_normals(std::size_t n) {
    std::uint64_t column[batch] = {};
    double normals[batch];
    for (std::size_t k = 0; k < words_each_; ++k) {
      if ((normal_places_ >> k & 1u) == 0) continue;
      std::uint64_t* const at = words_.data() + k;
      for (std::size_t s = 0; s < n; ++s) column[s] = at[s * words_each_];
      normals_from_words(column, normals, (n + 7) / 8 * 8);
      for (std::size_t s = 0; s < n; ++s) at[normals_ahead_ + s * words_each_] = std::bit_cast<std::uint64_t>(normals[s]);
    }
  }

  instance_t<Sampler> sampler_;
  instance_t<Weighter> weighter_;
  run_terms const& terms_;
  draws draws_;
  std::array<double, items> largest_;
  std::uint64_t failed_ = 0;
  std::uint64_t expected_first_ = 0, expected_last_ = 0;  // samples that come in turn
  std::uint64_t ahead_first_ = 0, ahead_size_ = 0;        // those of them whose first words are made
  std::size_t words_each_ = 4;
  std::size_t normals_ahead_ = 0;     // from a word to its normal deviate; 0: none are made
  std::uint64_t normal_places_ = 0;   // those of each sample's words that are made to normal deviates too
  std::vector<std::uint64_t> words_;
};

/// Which samples a run looks at again: a few of the first block, out of step
/// with it, so that what a sampler keeps between calls shows.
inline std::vector<std::uint64_t> probed_samples(std::uint64_t size) {
  if (size < 4) {
    std::vector<std::uint64_t> all;
    for (std::uint64_t i = size; i-- > 0;) all.push_back(i);
    return all;
  }
  std::uint64_t const wanted = size < 300 ? 3 : size < 800 ? size / 100 : 8;
  std::vector<std::uint64_t> some;
  for (unsigned const i : {3u, 1u, 2u, 5u, 8u, 13u, 21u, 34u})
    if (i < size && some.size() < wanted) some.push_back(i);
  return some;
}

}  // namespace steelyard::inline v1::detail
