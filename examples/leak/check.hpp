// SPDX-License-Identifier: BSL-1.0
#pragma once

// Whether the answer is right: beside a quadrature of the same posterior, and beside the true state of the invented
// case.

#include <array>
#include <charconv>
#include <cstddef>
#include <ostream>
#include <string>
#include <string_view>
#include <vector>

#include "page.hpp"
#include "reference.hpp"

namespace leak {

/// The true state of the invented case, from lines "true position 742 m" in the file's comments.
inline state true_state(csv_file const& file) {
  std::array<std::string_view, 5> const names{"position", "opening", "roughness", "demand", "inlet_pressure"};
  std::array<double, 5> values{};
  for (std::size_t i = 0; i < names.size(); ++i) {
    std::string const start = "true " + std::string(names[i]) + " ";
    bool found = false;
    for (std::string const& each : file.comments())
      if (each.starts_with(start)) {
        char const* const begin = each.data() + start.size();
        found = std::from_chars(begin, each.data() + each.size(), values[i]).ec == std::errc();
      }
    if (!found)
      throw bad_file(file.path() + ": its comments do not tell the true " + std::string(names[i]) +
                     ", which --check needs");
  }
  return settle(values[0], values[1], values[2], values[3], values[4]);
}

/// Prints what does not fit, and returns whether everything does. An exact value outside an error interval at the level
/// 1 - 1e-6 does not fit: with the fifteen or so compared here, one false alarm in some 60 000 seeds.
template <class Sample>
bool check(Sample const& sample, readings const& read, csv_file const& file, std::ostream& out) {
  namespace sy = steelyard;
  bool fits = true;
  auto const compare = [&](std::string const& what, sy::estimate const& answer, double exact) {
    sy::interval const error = answer.error_interval(1.0 - 1e-6);
    if ((error.lower_known && exact < error.lower) || (error.upper_known && exact > error.upper)) {
      fits = false;
      out << "Check failed: " << what << " is " << with_error(answer) << ", by quadrature " << exact << ".\n";
    }
  };
  sy::interval_result const flow = sample.interval(&state::leak_flow, 0.95);
  std::vector<double> const flows{flow.lower.value, 2.0, flow.upper.value};
  bool const rising = flows[0] < flows[1] && flows[1] < flows[2];
  reference const exact = by_quadrature(read, rising ? flows : std::vector<double>{2.0});
  auto const where = sample.histogram(&state::position, sy::equal_bins(0.0, length, exact.section.size()));
  for (std::size_t b = 0; b < where.size(); ++b)
    compare("the chance of " + stretches({b}), where.probability(b), exact.section[b]);
  compare("the mean leak flow", sample.expectation(&state::leak_flow), exact.mean_leak_flow);
  compare("the chance of more than 2 L/s", sample.probability([](state const& s) { return s.leak_flow > 2.0; }),
          1.0 - exact.flow_below[rising ? 1 : 0]);
  compare("the log-evidence", sample.log_evidence(), exact.log_evidence);
  if (rising) {
    compare("the chance below the lower end", flow.lower.cumulative(), exact.flow_below[0]);
    compare("the chance below the upper end", flow.upper.cumulative(), exact.flow_below[2]);
  }

  state const truth = true_state(file);
  auto const covers = [&](std::string const& what, auto readout, double value) {
    sy::interval const most = sample.interval(readout, 0.999);
    if (value < most.lower || value > most.upper) {
      fits = false;
      out << "Check failed: the true " << what << " is " << value << ", outside the 99.9 % interval " << most.lower
          << " to " << most.upper << ".\n";
    }
  };
  covers("position", &state::position, truth.position);
  covers("leak flow", &state::leak_flow, truth.leak_flow);
  covers("opening", &state::opening, truth.opening);
  covers("roughness", &state::roughness, truth.roughness);
  covers("demand", &state::demand, truth.demand);
  covers("inlet pressure", &state::inlet_pressure, truth.inlet_pressure);
  if (fits)
    out << wrapped(
        "Check passed: every answer agrees with a quadrature of the same posterior within its error bar, and the true "
        "leak (" +
        fixed(truth.leak_flow, 2) + " L/s at " + fixed(truth.position, 0) + " m) lies inside the intervals.");
  return fits;
}

}  // namespace leak
