// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <tuple>
#include <utility>

#include <steelyard/base/functional.hpp>
#include <steelyard/estimate/accumulation.hpp>
#include <steelyard/estimate/estimator.hpp>
#include <steelyard/weigh/callable.hpp>

namespace steelyard::inline v1::detail {

template <class Readouts>
struct instances_of;
template <class... Rs>
struct instances_of<std::tuple<Rs...>> {
  using type = std::tuple<instance_t<Rs>...>;
  static type make(std::tuple<Rs...> const& all) {
    return std::apply([](Rs const&... each) { return type(instance_of<Rs>::make(each)...); }, all);
  }
};

/// One worker's readouts of several estimators: writes a row of columns for a state.
template <class State, class... Es>
class reader {
 public:
  static constexpr std::size_t columns = column_plan<State, Es...>::total;

  explicit reader(std::tuple<Es...> const& estimators)
      : readouts_(std::apply([](Es const&... e) { return std::tuple<readouts_t<Es>...>(readouts_t<Es>(e.readout())...); },
                             estimators)),
        called_(std::apply(
            [](auto const&... r) {
              return std::tuple<typename instances_of<readouts_t<Es>>::type...>(instances_of<readouts_t<Es>>::make(r)...);
            },
            readouts_)) {}
  reader(reader const&) = delete;
  reader& operator=(reader const&) = delete;

  /// Column c of the state goes to first[c * stride].
  void read(State const& state, double* first, std::size_t stride) const {
    read_each(state, first, stride, std::index_sequence_for<Es...>{});
  }

 private:
  template <std::size_t... I>
  void read_each([[maybe_unused]] State const& state, [[maybe_unused]] double*& first, [[maybe_unused]] std::size_t stride,
                 std::index_sequence<I...>) const {
    (read_one(std::get<I>(called_), state, first, stride,
              std::make_index_sequence<std::tuple_size_v<std::remove_cvref_t<decltype(std::get<I>(called_))>>>{}),
     ...);
  }
  template <class Readouts, std::size_t... K>
  static void read_one([[maybe_unused]] Readouts const& of_one, [[maybe_unused]] State const& state,
                       [[maybe_unused]] double*& first, [[maybe_unused]] std::size_t stride,
                       std::index_sequence<K...>) {
    (write(std::get<K>(of_one), state, first, stride), ...);
  }
  template <class R>
  static void write(R const& r, State const& state, double*& first, std::size_t stride) {
    auto&& answer = detail::call(r, state);
    using columns_here = readout_columns<std::remove_cvref_t<decltype(answer)>>;
    columns_here::write(answer, first, stride);
    first += columns_here::size * stride;
  }

  std::tuple<readouts_t<Es>...> readouts_;
  std::tuple<typename instances_of<readouts_t<Es>>::type...> called_;
};

}  // namespace steelyard::inline v1::detail
