// SPDX-License-Identifier: BSL-1.0
#pragma once

// What is known about the invented main before any reading, and how its instruments err.

#include <cmath>

#include <steelyard/steelyard.hpp>

#include "hydraulics.hpp"
#include "readings.hpp"

namespace leak {

/// Water at 80 degrees Celsius and about 6 bar. [IAPWS-95 and IAPWS 2008 viscosity, rounded]
inline constexpr fluid hot_water{972.0, 3.65e-7};

inline constexpr double inside_diameter = 0.1325;  // m: steel 139.7 x 3.6 mm, DN 125
inline constexpr double section = 100.0;           // m, what one crew digs up in a day

// Before any reading.
inline constexpr double smallest_opening = 0.3, largest_opening = 3.0;    // cm2, even on a logarithmic scale
inline constexpr double median_roughness = 0.1, log_roughness_sd = 0.30;  // mm, lognormal: steel some decades in use
inline constexpr double usual_demand = 15.0, demand_sd = 0.4;             // L/s, normal: the consumers' own meters
inline constexpr double set_inlet_pressure = 620.0, inlet_pressure_sd = 1.5;  // kPa, gauge, normal: held by a pump

/// One way the main could be, and what flows in it then.
struct state {
  double position;         // m from the plant
  double opening;          // cm2
  double roughness;        // mm
  double demand;           // L/s
  double inlet_pressure;   // kPa
  double leak_flow;        // L/s
  double loss_upstream;    // kPa/m
  double loss_downstream;  // kPa/m

  /// Pressure at a distance from the plant (kPa).
  double pressure_at(double x) const {
    return x < position ? inlet_pressure - loss_upstream * x
                        : inlet_pressure - loss_upstream * position - loss_downstream * (x - position);
  }
};

/// The state that follows from what is drawn.
inline state settle(double position, double opening, double roughness, double demand, double inlet_pressure) {
  pipe const along{length, inside_diameter, 1e-3 * roughness};
  steady_flow const flow = solve(along, hot_water, 1e3 * inlet_pressure, 1e-3 * demand, position, 1e-4 * opening);
  double const leak_flow = 1e3 * flow.leak_flow;
  double const upstream = 1e-3 * flow.gradient_upstream, downstream = 1e-3 * flow.gradient_downstream;
  return {position, opening, roughness, demand, inlet_pressure, leak_flow, upstream, downstream};
}

/// The simulator: draws what is not known and solves the flow.
inline state simulate(steelyard::draws& draws) {
  double const position = draws.uniform(0.0, length);
  double const opening = std::exp(draws.uniform(std::log(smallest_opening), std::log(largest_opening)));
  double const roughness = median_roughness * std::exp(draws.normal(0.0, log_roughness_sd));
  double const demand = draws.normal(usual_demand, demand_sd);
  double const inlet_pressure = draws.normal(set_inlet_pressure, inlet_pressure_sd);
  return settle(position, opening, roughness, demand, inlet_pressure);
}

// The instruments.
inline constexpr double display_step = 0.1, logger_sd = 0.8;  // kPa
inline constexpr double meter_sd = 0.25;                      // L/s

/// All readings as one weighter. Each logger displays to 0.1 kPa, so a reading is a cell of that width, not a point.
inline auto weigh_by(readings const& read) {
  namespace sy = steelyard;
  auto const pressure_at = [](double x) { return [x](state const& s) { return s.pressure_at(x); }; };
  auto const logger = sy::rounded(display_step, sy::normal_noise(logger_sd));
  return sy::together(sy::reading("logger 1", read.logger_1.value, pressure_at(read.logger_1.position), logger),
                      sy::reading("logger 2", read.logger_2.value, pressure_at(read.logger_2.position), logger),
                      sy::reading("make-up meter", read.meter.value, &state::leak_flow, sy::normal_noise(meter_sd)));
}

}  // namespace leak
