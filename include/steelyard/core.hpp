// SPDX-License-Identifier: BSL-1.0
#pragma once

// Draw, weigh, answer: everything that needs the standard library alone.

#include <steelyard/draw/draws.hpp>
#include <steelyard/draw/legacy.hpp>
#include <steelyard/draw/words.hpp>
#include <steelyard/estimate/advice.hpp>
#include <steelyard/estimate/answers.hpp>
#include <steelyard/estimate/correlation.hpp>
#include <steelyard/estimate/covariance.hpp>
#include <steelyard/estimate/cumulative.hpp>
#include <steelyard/estimate/diagnosis.hpp>
#include <steelyard/estimate/difference.hpp>
#include <steelyard/estimate/estimator.hpp>
#include <steelyard/estimate/expectation.hpp>
#include <steelyard/estimate/health.hpp>
#include <steelyard/estimate/histogram.hpp>
#include <steelyard/estimate/histogram_2d.hpp>
#include <steelyard/estimate/log_evidence.hpp>
#include <steelyard/estimate/mode.hpp>
#include <steelyard/estimate/moments.hpp>
#include <steelyard/estimate/probability.hpp>
#include <steelyard/estimate/quantile.hpp>
#include <steelyard/estimate/ratio.hpp>
#include <steelyard/estimate/shortest_interval.hpp>
#include <steelyard/estimate/tail_index.hpp>
#include <steelyard/estimate/until.hpp>
#include <steelyard/run/pipeline.hpp>
#include <steelyard/run/plan.hpp>
#include <steelyard/run/threads.hpp>
#include <steelyard/sample/ensemble.hpp>
#include <steelyard/sample/picker.hpp>
#include <steelyard/sample/resample.hpp>
#include <steelyard/sample/weigh.hpp>
#include <steelyard/sample/weighted_sample.hpp>
#include <steelyard/weigh/adapt.hpp>
#include <steelyard/weigh/callable.hpp>
#include <steelyard/weigh/concepts.hpp>
#include <steelyard/weigh/likelihood.hpp>
#include <steelyard/weigh/readout.hpp>
#include <steelyard/weigh/together.hpp>
