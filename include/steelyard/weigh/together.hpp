// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <array>
#include <cstddef>
#include <span>
#include <string>
#include <string_view>
#include <tuple>
#include <type_traits>
#include <utility>
#include <vector>

#include <steelyard/base/error.hpp>
#include <steelyard/base/functional.hpp>
#include <steelyard/weigh/itemised.hpp>

namespace steelyard::inline v1 {

/// A plain weighter with a name, so that it has a column of its own.
template <class Weighter>
class named {
 public:
  named(std::string name, Weighter weighter) : name_(std::move(name)), weighter_(std::move(weighter)) {}

  [[nodiscard]] std::string_view name() const noexcept { return name_; }

  template <class State>
    requires detail::callable_v<Weighter, State const&>
  auto operator()(State const& state) const {
    return detail::call(weighter_, state);
  }
  [[nodiscard]] double log_bound() const
    requires detail::bounded_weighter<Weighter>
  {
    return weighter_.log_bound();
  }
  [[nodiscard]] auto worker_instance() const
    requires detail::per_worker_callable<Weighter>
  {
    return steelyard::named(name_, weighter_.worker_instance());
  }

 private:
  std::string name_;
  Weighter weighter_;
};

/// Several readings weighed as one, independent of each other given the state:
/// log-likelihoods add, and each keeps its own column. An itemised weighter
/// among them brings all its items.
/// @throws bad_name where two items have one name.
template <class... Weighters>
class together {
  template <class W>
  static constexpr bool fits = detail::has_items_v<W> || detail::named_weighter<W>;
  static_assert(sizeof...(Weighters) > 0, "steelyard: together() needs at least one weighter");
  static_assert((fits<Weighters> && ...),
                "steelyard: together() takes named weighters: wrap a plain one as sy::named(\"gauge\", weighter)");

 public:
  static constexpr std::size_t size = (detail::item_count<Weighters>() + ...);

  explicit together(Weighters... weighters) : weighters_(std::move(weighters)...) {
    std::size_t at = 0;
    std::apply([&](auto const&... each) { (take_names(each, at), ...); }, weighters_);
    for (std::size_t i = 0; i < size; ++i)
      for (std::size_t j = 0; j < i; ++j)
        if (names_[i] == names_[j])
          throw bad_name("together: two readings are called '" + names_[i] + "' among " + listed() +
                         "; each needs a name of its own");
  }

  [[nodiscard]] std::string_view name(std::size_t i) const { return names_.at(i); }

  template <class State>
    requires(weighter_for<Weighters, State> && ...)
  void scores(State const& state, std::span<double> out) const {
    std::size_t at = 0;
    auto one = [&](auto const& each) {
      constexpr std::size_t n = detail::item_count<std::remove_cvref_t<decltype(each)>>();
      detail::score_items(each, state, out.subspan(at, n));
      at += n;
    };
    std::apply([&](auto const&... each) { (one(each), ...); }, weighters_);
  }

  /// The bounds add up where every part declares one.
  [[nodiscard]] double log_bound() const
    requires(detail::bounded_weighter<Weighters> && ...)
  {
    return std::apply([](auto const&... each) { return (each.log_bound() + ...); }, weighters_);
  }

  [[nodiscard]] auto worker_instance() const
    requires(detail::per_worker_callable<Weighters> || ...)
  {
    return std::apply(
        [](auto const&... each) {
          return steelyard::together<std::remove_cvref_t<detail::instance_t<std::remove_cvref_t<decltype(each)>>>...>(
              detail::instance_of<std::remove_cvref_t<decltype(each)>>::make(each)...);
        },
        weighters_);
  }

  /// The parts as they were given.
  [[nodiscard]] std::tuple<Weighters...> const& parts() const noexcept { return weighters_; }

 private:
  template <class W>
  void take_names(W const& weighter, std::size_t& at) {
    for (std::size_t i = 0; i < detail::item_count<W>(); ++i) names_[at++] = detail::item_name(weighter, i);
  }
  [[nodiscard]] std::string listed() const {
    std::string text;
    for (std::string const& each : names_) text += (text.empty() ? "'" : ", '") + each + "'";
    return text;
  }

  std::tuple<Weighters...> weighters_;
  std::array<std::string, size> names_;
};

namespace detail {

/// What the readings in a weighter have to say against themselves, a sentence each.
template <class Weighter>
void collect_doubts(Weighter const& weighter, std::vector<std::string>& doubts) {
  if constexpr (requires { weighter.doubts(); }) {
    std::string sentence = weighter.doubts();
    if (!sentence.empty()) doubts.push_back(std::move(sentence));
  } else if constexpr (requires { weighter.parts(); }) {
    std::apply([&](auto const&... part) { (collect_doubts(part, doubts), ...); }, weighter.parts());
  }
}

}  // namespace detail

}  // namespace steelyard::inline v1
