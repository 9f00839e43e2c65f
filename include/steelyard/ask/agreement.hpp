// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <cstdint>
#include <iosfwd>
#include <span>
#include <string>
#include <tuple>
#include <type_traits>
#include <utility>
#include <vector>

#include <steelyard/ask/next_reading.hpp>
#include <steelyard/ask/weighted_mean.hpp>
#include <steelyard/base/elementary.hpp>
#include <steelyard/base/text.hpp>
#include <steelyard/instrument/reading.hpp>
#include <steelyard/instrument/scalar_instrument.hpp>
#include <steelyard/weigh/together.hpp>

namespace steelyard::inline v1 {

struct agreement_terms {
  count seed = 1;
  double hard_to_believe = 0.01;  ///< a two-sided chance below this is a finding
};

/// How one reading sits with the others and the simulator.
struct reading_agreement {
  std::string name;
  estimate chance;    ///< that a reading under the others would lie at least as far out, on either side
  bool doubtful = false;
};

/// Whether readings and simulator agree.
class agreement {
 public:
  explicit agreement(std::vector<reading_agreement> each, double limit) : each_(std::move(each)) {
    for (reading_agreement& r : each_) {
      r.doubtful = r.chance.value < limit;
      if (!r.doubtful) continue;
      findings_.push_back({finding_kind::reading_doubt,
                           "Reading '" + r.name + "' is hard to believe: given the simulator and the other readings, one at least as "
                           "far out has a chance of " + chance_text(r.chance) +
                               ". Check the reading, its instrument's error, and whether the simulator can show it."});
    }
  }
  [[nodiscard]] std::size_t size() const noexcept { return each_.size(); }
  [[nodiscard]] reading_agreement const& operator[](std::size_t i) const noexcept { return each_[i]; }
  [[nodiscard]] auto begin() const noexcept { return each_.begin(); }
  [[nodiscard]] auto end() const noexcept { return each_.end(); }
  [[nodiscard]] std::span<finding const> findings() const noexcept { return findings_; }
  [[nodiscard]] bool holds() const noexcept { return findings_.empty(); }

  [[nodiscard]] static std::string chance_text(estimate const& e) {
    if (e.never_seen()) return "at most " + detail::short_number(e.error_interval(0.95).upper);
    return detail::rounded_to_error(e.value, e.standard_error) + " (" + std::string(to_string(e.verdict())) + ")";
  }

 private:
  std::vector<reading_agreement> each_;
  std::vector<finding> findings_;
};

namespace detail {

template <class R>
concept is_reading = requires(R const& r) {
  r.name();
  r.value();
  r.readout();
  r.instrument();
};

/// Chance of a reading below, or above, this one at every state, ties counted by
/// the share v; for a censored reading the chance of the reading itself. Exact where the instrument
/// knows its distribution function, else by one fake a state.
template <class X, class Reading>
std::vector<double> tail_chances(weighted_sample<X> const& others, Reading const& r, bool upper, double v, std::uint64_t seed,
                                 bool& one_sided) {
  using instrument = std::remove_cvref_t<decltype(r.instrument())>;
  using value = std::remove_cvref_t<decltype(r.value())>;
  std::vector<double> chances(others.size(), 0.0);
  auto const wanted = [&](std::size_t i) { return others.log_weights()[i] > impossible; };
  auto const each_truth = [&](auto act) {
    for_each_state(*others.store(), *others.origin(), others.size(), r.readout(), wanted,
                   [&](auto const& own, std::size_t i, X const& state) {
                     call_user("a readout", others.sample_index(i), [&] { chances[i] = act(i, truth_of<instrument>(call(own, state))); });
                   });
  };
  if constexpr (std::is_convertible_v<value const&, shown> && requires(instrument const& a, typename instrument::truth_type const& t) {
                  a.log_below(0.0, t);
                  a.log_above(0.0, t);
                  a.log_density(0.0, t);
                  a.admit(t);
                }) {
    shown const read = r.value();
    if (read.what() == shown::kind::number) {
      each_truth([&](std::size_t, auto const& truth) {
        auto const& by = r.instrument();
        auto const admitted = by.admit(truth);
        double const beyond = portable_exp(upper ? by.log_above(read.lower(), admitted) : by.log_below(read.lower(), admitted));
        if constexpr (instrument::scale_kind == scale_of::continuous)
          return beyond;
        else
          return beyond + v * portable_exp(by.log_density(read.lower(), admitted));
      });
      return chances;
    }
    one_sided = true;
    each_truth([&](std::size_t, auto const& truth) { return portable_exp(to_log(r.instrument().score(read, truth))); });
    return chances;
  } else {
    one_sided = true;  // share of fakes that are no likelier than what was read
    each_truth([&](std::size_t i, auto const& truth) {
      draws source(seed, others.sample_index(i), purpose::prediction, 1);
      auto const fake = r.instrument().draw(truth, source);
      double const of_fake = to_log(r.instrument().score(fake, truth)), of_read = to_log(r.instrument().score(r.value(), truth));
      return of_fake < of_read ? 1.0 : of_fake == of_read ? v : 0.0;
    });
    return chances;
  }
}

template <class X, class Reading>
reading_agreement agreement_of(weighted_sample<X> const& sample, Reading const& r, std::string const& name, std::uint64_t seed,
                               std::size_t position) {
  weighted_sample<X> const others = sample.without(name);
  double const v = draws(seed, position, purpose::prediction, 2).uniform();
  bool one_sided = false;
  estimate const lower = weighted_mean(others, tail_chances(others, r, false, v, seed, one_sided), error_scale::logit);
  if (one_sided) return {name, lower};
  if (lower.value <= 0.5) return {name, lower.scaled(2.0)};
  return {name, weighted_mean(others, tail_chances(others, r, true, 1.0 - v, seed, one_sided), error_scale::logit).scaled(2.0)};
}

}  // namespace detail

/// Do the readings agree with each other and with the simulator? For each, the
/// chance, given all the others, that the instrument would have shown something
/// at least as far out: twice the smaller tail, randomised for counts and
/// rounded readings; for a censored reading the chance of that reading itself;
/// for readings of several numbers or classes the chance of one no likelier.
/// A chance below the limit becomes a finding. No new run.
/// @param weighter  the `together` of readings that weighed the sample, or the one reading
template <class X, class... Readings>
agreement agree(weighted_sample<X> const& sample, together<Readings...> const& weighter, agreement_terms const& terms = {}) {
  constexpr bool fine = (detail::is_reading<Readings> && ...);
  static_assert(fine, "steelyard: agree() takes readings: sy::reading(name, value, readout, instrument)");
  std::vector<reading_agreement> all;
  std::size_t at = 0;
  if constexpr (fine)
    std::apply(
        [&](auto const&... r) {
          (all.push_back(detail::agreement_of(sample, r, std::string(r.name()), terms.seed, at++)), ...);
        },
        weighter.parts());
  return agreement(std::move(all), terms.hard_to_believe);
}
template <class X, class Value, class Readout, class Instrument>
agreement agree(weighted_sample<X> const& sample, reading<Value, Readout, Instrument> const& weighter, agreement_terms const& terms = {}) {
  std::string const name = detail::item_name(weighter, 0);
  return agreement({detail::agreement_of(sample, weighter, name, terms.seed, 0)}, terms.hard_to_believe);
}

/// One sentence a reading, then the findings.
[[nodiscard]] inline std::string to_string(agreement const& a) {
  std::string text;
  for (reading_agreement const& r : a)
    text += (text.empty() ? "" : "\n") + std::string("Reading '") + r.name + "': a chance of " + agreement::chance_text(r.chance) +
            " of one at least as far out.";
  for (finding const& each : a.findings()) text += "\n" + each.text;
  return text;
}

template <class Char, class Traits>
std::basic_ostream<Char, Traits>& operator<<(std::basic_ostream<Char, Traits>& out, agreement const& a) {
  return out << to_string(a).c_str();
}

}  // namespace steelyard::inline v1
