// SPDX-License-Identifier: BSL-1.0
#pragma once

// Steady flow in one straight main with one leak. SI units throughout: m, m2, m3/s, Pa, kg/m3.

#include <cmath>
#include <stdexcept>
#include <string>

namespace leak {

struct fluid {
  double density;              // kg/m3
  double kinematic_viscosity;  // m2/s
};

struct pipe {
  double length;     // m
  double diameter;   // m, inside
  double roughness;  // m
};

/// Mean velocity of a flow (m/s).
inline double velocity(double flow, double diameter) {
  return flow / (0.25 * 3.14159265358979324 * diameter * diameter);
}

/// Darcy friction factor of turbulent flow, within about 1 % of the Colebrook equation.
///   f = 0.25 / log10(roughness / (3.7 D) + 5.74 / Re^0.9)^2
///                                   [Swamee & Jain, J. Hydraul. Div. ASCE 102(5), 1976, 657]
/// @throws std::domain_error outside 5e3 <= Re <= 1e8, where the formula was not made for
inline double friction_factor(double reynolds, double relative_roughness) {
  if (!(reynolds >= 5e3 && reynolds <= 1e8))
    throw std::domain_error("friction_factor: a Reynolds number of " + std::to_string(reynolds) +
                            " is outside 5e3 to 1e8, the range of the formula");
  double const root = std::log10(relative_roughness / 3.7 + 5.74 / std::pow(reynolds, 0.9));
  return 0.25 / (root * root);
}

/// Pressure lost by friction on each metre of pipe (Pa/m).
///   f / D * density v^2 / 2                                             [Darcy and Weisbach]
inline double pressure_gradient(double flow, pipe const& along, fluid const& water) {
  double const v = velocity(flow, along.diameter);
  double const reynolds = v * along.diameter / water.kinematic_viscosity;
  return friction_factor(reynolds, along.roughness / along.diameter) / along.diameter * 0.5 * water.density * v * v;
}

/// Discharge coefficient of a sharp-edged opening: common textbook value.
inline constexpr double discharge_coefficient = 0.61;

/// What leaves through an opening into the open (m3/s); nothing where the pressure inside is no higher than outside.
///   C A sqrt(2 p / density)                                             [Torricelli; Borda]
inline double orifice_flow(double area, double gauge_pressure, fluid const& water) {
  return gauge_pressure > 0.0 ? discharge_coefficient * area * std::sqrt(2.0 * gauge_pressure / water.density) : 0.0;
}

struct steady_flow {
  double leak_flow;            // m3/s
  double gradient_upstream;    // Pa/m, between inlet and leak
  double gradient_downstream;  // Pa/m, between leak and consumer
};

/// The flow that fits: what leaves depends on the pressure at the leak, and that on what flows to it. With q leaking, Q
/// delivered, h the pressure lost before the leak and p that at it, q - orifice(p) rises with q at a rate of about
/// 1 + q h / ((Q + q) p); Newton's steps with that rate, kept between the flows already known to be too small and too
/// large, until a step is below 1e-12 of the flow.
/// @throws std::domain_error where friction uses up the inlet pressure before the leak even if nothing leaks
inline steady_flow solve(pipe const& along, fluid const& water, double inlet_pressure, double demand, double position,
                         double opening) {
  double const downstream = pressure_gradient(demand, along, water);
  if (!(inlet_pressure - downstream * position > 0.0))
    throw std::domain_error(
        "solve: the inlet pressure is used up by friction before the leak; it cannot drive this demand");
  double too_small = 0.0, too_large = orifice_flow(opening, inlet_pressure, water), leak_flow = too_large;
  for (int round = 0; round < 200; ++round) {
    double const upstream = pressure_gradient(demand + leak_flow, along, water), lost = upstream * position;
    double const pressure = inlet_pressure - lost, leaves = orifice_flow(opening, pressure, water);
    (leaves < leak_flow ? too_large : too_small) = leak_flow;
    double next = 0.5 * (too_small + too_large);
    if (pressure > 0.0) {
      double const step = (leaves - leak_flow) / (1.0 + leaves * lost / ((demand + leak_flow) * pressure));
      if (std::abs(step) <= 1e-12 * (demand + leak_flow)) return {leak_flow, upstream, downstream};
      if (leak_flow + step > too_small && leak_flow + step < too_large) next = leak_flow + step;
    }
    leak_flow = next;
  }
  throw std::domain_error("solve: the flow does not settle");
}

}  // namespace leak
