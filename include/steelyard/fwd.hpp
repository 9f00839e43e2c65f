// SPDX-License-Identifier: BSL-1.0
#pragma once

// Names without definitions, for headers that only mention them.

#include <cstddef>

namespace steelyard::inline v1 {

class draws;
struct log_likelihood;
struct likelihood;
template <class F>
class readout;
template <class... Weighters>
class together;

class estimate;
template <std::size_t N>
class estimates;
struct interval;
class histogram_result;
class histogram_2d_result;
class mode_result;
class quantile_result;
struct interval_result;
struct shortest_interval_result;
class cumulative_result;
struct moments_result;
class correlation_result;
template <std::size_t N>
class covariance_result;
class diagnosis;
enum class verdict;
template <class... As>
class answers;

template <class X>
class weighted_sample;
template <class X>
class ensemble;
template <class X>
class picker;

struct plan;
class executor;
template <class Sampler, class Weighter>
class pipeline;

}  // namespace steelyard::inline v1
