// SPDX-License-Identifier: BSL-1.0
#pragma once

// The discrete distributions of Boost.Math, declared but not included: a user
// who hands one over has included it.
namespace boost::math {
template <class RealType, class Policy>
class bernoulli_distribution;
template <class RealType, class Policy>
class binomial_distribution;
template <class RealType, class Policy>
class geometric_distribution;
template <class RealType, class Policy>
class hypergeometric_distribution;
template <class RealType, class Policy>
class negative_binomial_distribution;
template <class RealType, class Policy>
class poisson_distribution;
}  // namespace boost::math

namespace steelyard::inline v1 {

/// Says that a distribution lives on whole numbers: `draws.from(dist, sy::discrete)`.
struct discrete_t {
  explicit discrete_t() = default;
};
inline constexpr discrete_t discrete{};

namespace detail {

template <class Distribution>
inline constexpr bool is_known_discrete = false;
template <class R, class P>
inline constexpr bool is_known_discrete<boost::math::bernoulli_distribution<R, P>> = true;
template <class R, class P>
inline constexpr bool is_known_discrete<boost::math::binomial_distribution<R, P>> = true;
template <class R, class P>
inline constexpr bool is_known_discrete<boost::math::geometric_distribution<R, P>> = true;
template <class R, class P>
inline constexpr bool is_known_discrete<boost::math::hypergeometric_distribution<R, P>> = true;
template <class R, class P>
inline constexpr bool is_known_discrete<boost::math::negative_binomial_distribution<R, P>> = true;
template <class R, class P>
inline constexpr bool is_known_discrete<boost::math::poisson_distribution<R, P>> = true;

}  // namespace detail
}  // namespace steelyard::inline v1
