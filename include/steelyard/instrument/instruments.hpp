// SPDX-License-Identifier: BSL-1.0
#pragma once

// Every instrument and modifier, and `reading`.

#include <steelyard/instrument/anywhere.hpp>
#include <steelyard/instrument/binomial_count.hpp>
#include <steelyard/instrument/cell.hpp>
#include <steelyard/instrument/class_grader.hpp>
#include <steelyard/instrument/confusion.hpp>
#include <steelyard/instrument/correlated_noise.hpp>
#include <steelyard/instrument/dead_time_counter.hpp>
#include <steelyard/instrument/exponential_life.hpp>
#include <steelyard/instrument/hit_miss.hpp>
#include <steelyard/instrument/instrument_for.hpp>
#include <steelyard/instrument/label_grader.hpp>
#include <steelyard/instrument/laplace_noise.hpp>
#include <steelyard/instrument/lognormal_noise.hpp>
#include <steelyard/instrument/negative_binomial_count.hpp>
#include <steelyard/instrument/normal_noise.hpp>
#include <steelyard/instrument/poisson_count.hpp>
#include <steelyard/instrument/reading.hpp>
#include <steelyard/instrument/rounded.hpp>
#include <steelyard/instrument/scalar_instrument.hpp>
#include <steelyard/instrument/shown.hpp>
#include <steelyard/instrument/student_noise.hpp>
#include <steelyard/instrument/triangular_noise.hpp>
#include <steelyard/instrument/two_part_noise.hpp>
#include <steelyard/instrument/uniform_tolerance.hpp>
#include <steelyard/instrument/with_offset.hpp>
#include <steelyard/instrument/with_outliers.hpp>
