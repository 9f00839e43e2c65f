// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cmath>
#include <cstddef>
#include <functional>
#include <span>
#include <string>
#include <utility>
#include <vector>

#include <steelyard/base/bits.hpp>
#include <steelyard/base/count.hpp>
#include <steelyard/base/error.hpp>
#include <steelyard/base/text.hpp>
#include <steelyard/draw/draws.hpp>
#include <steelyard/estimate/estimator.hpp>
#include <steelyard/proof/answer_numbers.hpp>
#include <steelyard/proof/check.hpp>
#include <steelyard/run/bytes.hpp>

namespace steelyard::inline v1::proof {

struct self_options {
  std::size_t columns = 1;     ///< readout columns that `add` expects
  std::size_t entries = 600;
  count seed = 1;
  double tolerance = 1e-9;     ///< relative, for what rounding alone may change
  std::function<double(draws&)> value = {};  ///< values to feed; standard exponentials unless given
};

namespace detail {

/// Feeds an estimator the same numbers in many ways; keeps the first law that does not hold.
template <class E>
class law_trial {
 public:
  law_trial(E prepared, feed all, self_options const& options)
      : prepared_(std::move(prepared)),
        all_(std::move(all)),
        options_(options),
        whole_(answer_numbers(fed(all_), all_)) {
    for (std::size_t k = 0; k < whole_.size(); ++k)
      if (!up::is_finite(whole_[k]) && broken_.empty())
        broken_ = "number " + std::to_string(k) + " of the answer is " + up::plain_number(whole_[k]) +
                  ", not a finite number";
    if (whole_.empty()) broken_ = "the answer holds no number";
  }

  [[nodiscard]] std::string const& broken() const noexcept { return broken_; }

  void merging() {
    feed const a = part(0, 3), b = part(3, 6), d = part(6, 12);
    same("adding in several calls differs from adding in one", fed(a, b, d), all_);
    E left = fed(a), right = fed(b);
    left += right;
    left += fed(d);
    same("parts merged from the left differ from the whole", left, all_);
    right += fed(d);
    E first = fed(a);
    first += right;
    same("parts merged from the right differ from the whole", first, all_);
    E last = fed(d);
    last += fed(a);
    last += fed(b);
    same("parts merged in another order differ from the whole", last, all_);
    E again = fed(a).fresh();
    again += fed(all_);
    same("fresh() is not empty", again, all_);
    E empty = prepared_.fresh();
    if constexpr (!up::takes_zeros<E>) add_feed(empty, feed());
    empty += fed(all_);
    empty += prepared_.fresh();
    if constexpr (!up::takes_zeros<E>) add_feed(empty, feed());
    same("an empty part changes the answer", empty, all_);
  }
  void rescaling() {
    E scaled = fed(all_.scaled(8.0));
    scaled.rescale(0.125);
    same("rescale(1/8) does not undo a factor of 8", scaled, all_);
    E half = fed(part(0, 4).scaled(4.0));
    half.rescale(0.25);
    half += fed(part(4, 12));
    same("a rescaled part does not merge with the others", half, all_);
    same("a factor on all weights changes the answer", fed(all_.scaled(1e-3)), all_.scaled(1e-3));
    E nothing = prepared_.fresh();
    nothing.rescale(0.5);
    nothing += fed(all_);
    same("rescaling an empty part changes the answer", nothing, all_);
    if constexpr (!up::takes_zeros<E>) {
      E vanished = fed(part(0, 4));
      vanished.rescale(0.0);
      vanished += fed(all_);
      same("a part whose weights underflow changes the value", vanished, all_, true);
    }
  }
  void entries() {
    std::size_t const n = all_.weights.size(), c = options_.columns;
    feed reversed = all_;
    for (std::size_t k = 0; k < c; ++k)
      for (std::size_t i = 0; i < n; ++i) reversed.values[k * n + i] = all_.values[k * n + (n - 1 - i)];
    for (std::size_t i = 0; i < n; ++i) reversed.weights[i] = all_.weights[n - 1 - i];
    same("the order of the entries changes the answer", fed(reversed), all_);
    if constexpr (!up::takes_zeros<E>) {
      feed half = all_.part(0, n / 5, c);
      for (double& w : half.weights) w *= 0.5;
      same("entries split in two of half the weight change the value", fed(half, half, all_.part(n / 5, n, c)), all_,
           true);
      feed zeros = all_;
      for (double& w : zeros.weights) w = 0.0;
      same("entries of weight zero, added last, change the value", fed(all_, zeros), all_, true);
      same("entries of weight zero, added first, change the value", fed(zeros, all_), all_, true);
      E of_zeros = fed(zeros);
      of_zeros += fed(all_);
      same("merging into entries of weight zero changes the value", of_zeros, all_, true);
      E with_zeros = fed(all_);
      with_zeros += fed(zeros);
      same("merging in entries of weight zero changes the value", with_zeros, all_, true);
    }
  }
  void storing() {
    E const from = fed(all_);
    up::byte_writer out;
    out.put_each(E::fields(from));
    E to = prepared_.fresh();
    up::byte_reader in(out.bytes());
    in.get_each(E::fields(to));
    same("fields() does not carry everything that was accumulated", to, all_);
    E half = fed(part(0, 6));
    up::byte_writer again;
    again.put_each(E::fields(half));
    E rest = prepared_.fresh();
    up::byte_reader back(again.bytes());
    back.get_each(E::fields(rest));
    add_feed(rest, part(6, 12));
    same("adding after fields() were read back differs from the whole", rest, all_);
  }

 private:
  [[nodiscard]] feed part(std::size_t from, std::size_t to) const {  // in twelfths
    std::size_t const n = all_.weights.size();
    return all_.part(from * n / 12, to * n / 12, options_.columns);
  }
  template <class... Parts>
  [[nodiscard]] E fed(Parts const&... parts) const {
    E e = prepared_.fresh();
    (add_feed(e, parts), ...);
    return e;
  }
  void same(char const* law, E const& e, feed const& f, bool value_alone = false) {
    if (!broken_.empty()) return;
    std::vector<double> const other = answer_numbers(e, f);
    if (other.size() != whole_.size()) {
      broken_ = std::string(law) + ": the answer holds " + std::to_string(other.size()) + " numbers instead of " +
                std::to_string(whole_.size());
      return;
    }
    for (std::size_t k = 0; k < (value_alone ? 1 : whole_.size()) && broken_.empty(); ++k) {
      double const size = std::abs(whole_[k]) > 1e-12 ? std::abs(whole_[k]) : 1e-12;
      if (!up::is_finite(other[k]) || std::abs(other[k] - whole_[k]) > options_.tolerance * size)
        broken_ = std::string(law) + ": number " + std::to_string(k) + " of the answer is " +
                  up::plain_number(other[k]) + " instead of " + up::plain_number(whole_[k]);
    }
  }

  E prepared_;
  feed all_;
  self_options const& options_;
  std::vector<double> whole_;
  std::string broken_;
};

}  // namespace detail

/// Whether an estimator of your own keeps the laws its engine relies on, fed
/// with made-up numbers: parts merge to the whole in any grouping and order, an
/// empty part changes nothing, a factor on all weights changes no answer, nor
/// does the order of the entries; an entry split in two shares its value;
/// all-zero weights are taken without harm, first or last; `fresh` is empty; and
/// `fields` carries everything through bytes.
///   the first law broken is named, with both numbers
/// Of what an estimator needs all at once, and of those fed with zero weights on purpose, the laws that bind them.
/// @throws bad_argument for fewer than 24 entries or a tolerance that is not positive.
template <class E>
  requires estimator<E>
check self_check(E const& estimator_, self_options const& options = {}) {
  std::size_t const n = options.entries, c = options.columns;
  if (n < 24)
    throw bad_argument("self_check: " + std::to_string(n) + " entries were asked for; at least 24 are needed");
  if (!detail::up::is_finite(options.tolerance) || !(options.tolerance > 0.0))
    throw bad_argument("self_check: the tolerance " + detail::up::plain_number(options.tolerance) +
                       " must be a positive finite number");
  draws source(options.seed, 0, purpose::calibration, 5);
  detail::feed all;
  for (std::size_t k = 0; k < c * n; ++k)
    all.values.push_back(options.value ? options.value(source) : source.exponential(1.0));
  for (std::size_t i = 0; i < n; ++i) all.weights.push_back(0.01 + source.uniform());
  E prepared = estimator_.fresh();
  if constexpr (detail::up::prepares<E>)
    prepared.prepare(std::span<double const>(all.values), std::span<double const>(all.weights));
  detail::law_trial<E> trial(std::move(prepared), std::move(all), options);
  trial.merging();
  trial.rescaling();
  trial.entries();
  trial.storing();
  if (!trial.broken().empty()) return {outcome::failed, trial.broken()};
  return {outcome::passed, "merging, rescaling, permutation, splitting, empty and zero parts and fields() all hold"};
}

/// The same for an estimator as it is run on states of this kind, which tells how many columns it reads.
template <class State, class E>
check self_check(E const& estimator_, self_options options = {}) {
  options.columns = detail::up::columns_of<detail::up::readouts_t<E>, State>::size;
  return self_check(detail::up::for_state<State>(estimator_), options);
}

}  // namespace steelyard::inline v1::proof
