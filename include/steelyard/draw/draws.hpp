// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <bit>
#include <cstddef>
#include <cstdint>
#include <span>
#include <vector>

#include <steelyard/base/bits.hpp>
#include <steelyard/base/count.hpp>
#include <steelyard/base/error.hpp>
#include <steelyard/base/text.hpp>
#include <steelyard/draw/discrete.hpp>
#include <steelyard/draw/first_words.hpp>
#include <steelyard/draw/from.hpp>
#include <steelyard/draw/inversion.hpp>
#include <steelyard/draw/philox.hpp>
#include <steelyard/draw/purpose.hpp>
#include <steelyard/draw/word_source.hpp>

namespace steelyard::inline v1 {
namespace detail {
struct draws_access;
[[noreturn]] void refuse_draw(char const* call, char const* what, double value, char const* rule);
}  // namespace detail

/// The source of random words handed to user code. Sample i draws from its own
/// stream, so what it draws depends on (seed, i) alone: not on threads, order
/// or other samples. One concrete type whatever feeds it. Models
/// `std::uniform_random_bit_generator` with 64-bit words, so standard
/// algorithms and distributions take it too; can be neither copied nor moved,
/// so no sampler can keep or fork its stream: take `draws&`.
///   Word w of block b of a stream is Philox4x64-10 output word w at counter
///   (b, stream, purpose, round) under key (seed, 0); words come in order 0 to 3.
class draws {
 public:
  using result_type = std::uint64_t;

  /// Stream number `stream` of `seed`, from its first word.
  explicit draws(count seed, count stream = 0, purpose what = purpose::run, count round = 0) noexcept
      : seed_(seed), stream_(stream), round_(round), purpose_(what) {}

  draws(draws const&) = delete;
  draws& operator=(draws const&) = delete;

  static constexpr result_type min() noexcept { return 0; }
  static constexpr result_type max() noexcept { return ~result_type{0}; }

  /// The next 64-bit word.
  result_type operator()() {
    if (next_ == end_) [[unlikely]]
      refill();
    return *next_++;
  }

  /// Uniform on (0, 1): ((w >> 12) + 0.5) * 2^-52, never 0 or 1. One word.
  double uniform() { return detail::uniform_from_word((*this)()); }

  /// Uniform on [a, b]; an end is met only by rounding. One word.
  /// @throws bad_argument unless a <= b and b - a is finite
  double uniform(double a, double b) {
    double const width = detail::minus(b, a);
    if (!detail::is_finite(width) || !(width >= 0.0)) refuse_interval(a, b);
    double const x = detail::plus(a, detail::times(width, uniform()));
    return x < b ? x : b;
  }

  /// Standard normal, by inverting the nearer tail: rises with the word, and
  /// tails are right down to 2^-65. One word.
  double normal() {
    if (normals_ahead_ != 0 && next_ != end_) {
      std::uint64_t const made = next_[normals_ahead_];
      if (made != 0) {
        ++next_;
        return std::bit_cast<double>(made);
      }
    }
    return normal_afresh();
  }

  /// Normal with mean and standard deviation. One word.
  /// @throws bad_argument unless both are finite and sd >= 0
  double normal(double mean, double sd) {
    if (!detail::is_finite(mean)) detail::refuse_draw("normal", "the mean", mean, "a finite number");
    if (!detail::is_finite(sd) || !(sd >= 0.0))
      detail::refuse_draw("normal", "the standard deviation", sd, "zero or a positive finite number");
    return detail::plus(mean, detail::times(sd, normal()));
  }

  /// Exponential with the given rate (mean 1/rate): rises with the word, and
  /// both ends keep all 64 bits. One word.
  /// @throws bad_argument unless rate is positive and finite
  double exponential(double rate) {
    if (!detail::is_finite(rate) || !(rate > 0.0))
      detail::refuse_draw("exponential", "the rate", rate, "a positive finite number");
    return detail::over(detail::exponential_from_word((*this)()), rate);
  }

  /// One of 0 .. n - 1, each exactly equally likely. One word, rarely more.
  ///   [Lemire, ACM Trans. Model. Comput. Simul. 29(1), 2019]
  /// @throws bad_argument for n = 0
  std::uint64_t index(count n) {
    std::uint64_t const choices = n;
    if (choices == 0) detail::refuse_draw("index", "the number of choices", 0.0, "at least 1");
    detail::wide_product place = detail::multiply_wide((*this)(), choices);
    if (place.low < choices) {
      std::uint64_t const surplus = (std::uint64_t{0} - choices) % choices;
      while (place.low < surplus) place = detail::multiply_wide((*this)(), choices);
    }
    return place.high;
  }

  /// True with probability p, exact to 2^-64. One word.
  /// @throws bad_argument unless 0 <= p <= 1
  bool chance(double p) {
    if (!detail::is_finite(p) || !(p >= 0.0) || !(p <= 1.0))
      detail::refuse_draw("chance", "the probability", p, "between 0 and 1");
    std::uint64_t const word = (*this)();
    return p >= 1.0 || word < static_cast<std::uint64_t>(p * 0x1p64);
  }

  /// A deviate of any distribution with Boost.Math's free functions: quantile
  /// and complement for a continuous one; for Boost's discrete ones the
  /// smallest k with cdf(k) >= u, whatever their rounding policy. One word.
  /// @throws whatever the distribution's own functions throw
  template <class Distribution>
  auto from(Distribution const& distribution) {
    if constexpr (detail::is_known_discrete<Distribution>) {
      return from(distribution, discrete);
    } else {
      static_assert(detail::has_quantiles<Distribution>,
                    "draws.from(dist): the distribution needs quantile(dist, p) and quantile(complement(dist, q)), "
                    "found by argument-dependent lookup as those of Boost.Math are");
      if constexpr (detail::has_quantiles<Distribution>) return detail::deviate_from_word(distribution, (*this)());
    }
  }

  /// The smallest k with cdf(k) >= u of a distribution on whole numbers. One word.
  template <class Distribution>
  auto from(Distribution const& distribution, discrete_t) {
    static_assert(detail::has_steps<Distribution>,
                  "draws.from(dist, discrete): the distribution needs quantile, cdf, complement and support, "
                  "found by argument-dependent lookup as those of Boost.Math are");
    if constexpr (detail::has_steps<Distribution>) return detail::smallest_count_from_word(distribution, (*this)());
  }

  /// Number of words taken from this stream so far.
  [[nodiscard]] std::uint64_t words_used() const noexcept {
    return supplied_ - static_cast<std::uint64_t>(end_ - next_);
  }

 private:
  friend struct detail::draws_access;
  static constexpr std::size_t buffer_words = 32;

  void refill();
  double normal_afresh();
  [[noreturn]] static void refuse_interval(double a, double b);

  std::uint64_t const* next_ = buffer_;
  std::uint64_t const* end_ = buffer_;
  std::uint64_t supplied_ = 0;  // words of this stream that end at end_
  std::uint64_t seed_;
  std::uint64_t stream_;
  std::uint64_t round_;
  purpose purpose_;
  word_source const* source_ = nullptr;           // a custom source, else Philox
  std::vector<std::uint64_t>* record_ = nullptr;  // recorded words, fresh ones appended
  std::uint64_t given_ = 0;                       // words the record held at the start
  std::size_t normals_ahead_ = 0;                 // where a word's normal deviate may stand, from the word on; 0: nowhere
  std::uint64_t normal_places_ = 0;               // those of the first 64 words that were wanted as normals and were not ready
  std::uint64_t buffer_[buffer_words];
};

namespace detail {

[[noreturn]] inline void refuse_draw(char const* call, char const* what, double value, char const* rule) {
  throw bad_argument(std::string("draws::") + call + ": " + what + " is " + plain_number(value) + "; it must be " +
                     rule);
}

/// What the engine may do with a `draws` and user code may not: put it on
/// another stream, feed it other words. Every call starts afresh at word 0.
struct draws_access {
  /// On stream (seed, stream, what, round). Cost: a few stores.
  static void seat(draws& d, std::uint64_t seed, std::uint64_t stream, purpose what = purpose::run,
                   std::uint64_t round = 0) noexcept {
    seat(d, seed, stream, what, round, std::span<std::uint64_t const>{});
  }

  /// The same, with the stream's first words already made.
  /// @pre the span holds whole blocks (a multiple of 4 words) and outlives their use
  static void seat(draws& d, std::uint64_t seed, std::uint64_t stream, purpose what, std::uint64_t round,
                   std::span<std::uint64_t const> first_words) noexcept {
    d.seed_ = seed;
    d.stream_ = stream;
    d.purpose_ = what;
    d.round_ = round;
    d.source_ = nullptr;
    d.record_ = nullptr;
    d.next_ = first_words.data();
    d.end_ = first_words.data() + first_words.size();
    d.supplied_ = first_words.size();
    d.normals_ahead_ = 0;
  }

  /// On another stream of the same run, its first words already made. Cost: five stores.
  /// @param normals_ahead  so many places behind a word stand the bits of its normal deviate, or 0 where it was not made;
  ///                       0: none were
  /// @pre `d` was last put on a stream without a custom source or recorded words
  static void move_on(draws& d, std::uint64_t stream, std::uint64_t const* first_words, std::size_t size,
                      std::size_t normals_ahead = 0) noexcept {
    d.stream_ = stream;
    d.next_ = first_words;
    d.end_ = first_words + size;
    d.supplied_ = size;
    d.normals_ahead_ = normals_ahead;
  }
  /// Bit k is set where word k of some stream was asked for as a normal deviate that was not ready.
  static std::uint64_t normal_places(draws const& d) noexcept { return d.normal_places_; }

  /// On sample `sample` of a custom source.
  /// @pre the source outlives its use
  static void seat(draws& d, word_source const& source, std::uint64_t seed, std::uint64_t sample) noexcept {
    seat(d, seed, sample);
    d.source_ = &source;
  }

  /// The next words, in order: as if each had been asked for, with those of whole blocks made where they are wanted.
  /// Cost  with 512-bit vectors two thirds of what words cost one at a time.
  static void fill(draws& d, std::span<std::uint64_t> out);

  /// On recorded words: first those in `record`, then fresh ones from the start
  /// of stream (seed, stream, what, round), appended to `record` as they are
  /// made. Afterwards the first `words_used()` entries are the words consumed;
  /// there may be fewer than were given, or a few unread ones behind them.
  /// @pre `record` outlives its use and is not touched meanwhile
  static void record(draws& d, std::vector<std::uint64_t>& record, std::uint64_t seed, std::uint64_t stream,
                     purpose what, std::uint64_t round = 0) noexcept {
    seat(d, seed, stream, what, round, std::span<std::uint64_t const>(record));
    d.record_ = &record;
    d.given_ = record.size();
  }
};

}  // namespace detail

// Out of line: more words are needed. Few at first, since most samples use
// few; then more at once.
#if defined(__GNUC__)
[[gnu::noinline]]
#endif
inline void draws::refill() {
  std::uint64_t const blocks = supplied_ < 8 ? 1 : supplied_ < 16 ? 2 : supplied_ < 32 ? 4 : buffer_words / 4;
  auto const size = static_cast<std::size_t>(4 * blocks);
  if (record_ != nullptr) {
    std::size_t const old = record_->size();
    record_->resize(old + size);
    std::span<std::uint64_t> const fresh(record_->data() + old, size);
    detail::stream_words(seed_, stream_, purpose_, round_, (old - given_) / 4, fresh);
    next_ = fresh.data();
  } else {
    std::span<std::uint64_t> const fresh(buffer_, size);
    if (source_ != nullptr)
      source_->fill(seed_, stream_, supplied_, fresh);
    else
      detail::stream_words(seed_, stream_, purpose_, round_, supplied_ / 4, fresh);
    next_ = buffer_;
  }
  end_ = next_ + size;
  supplied_ += size;
  normals_ahead_ = 0;
}

inline void detail::draws_access::fill(draws& d, std::span<std::uint64_t> out) {
  std::size_t at = 0;
  while (at < out.size() && d.next_ != d.end_) out[at++] = *d.next_++;
  if (d.source_ == nullptr && d.record_ == nullptr) {
    std::size_t const whole = (out.size() - at) / 4 * 4;
    stream_words(d.seed_, d.stream_, d.purpose_, d.round_, d.supplied_ / 4, out.subspan(at, whole));
    d.supplied_ += whole;
    at += whole;
  }
  while (at < out.size()) out[at++] = d();
}

#if defined(__GNUC__)
[[gnu::noinline]]
#endif
inline double draws::normal_afresh() {
  std::uint64_t const place = words_used();
  if (place < 64) normal_places_ |= std::uint64_t{1} << place;
  return detail::normal_from_word((*this)());
}

inline void draws::refuse_interval(double a, double b) {
  throw bad_argument("draws::uniform: from " + detail::plain_number(a) + " to " + detail::plain_number(b) +
                     " is no interval; the ends must be finite and in order");
}

}  // namespace steelyard::inline v1
