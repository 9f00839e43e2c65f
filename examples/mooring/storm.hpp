// SPDX-License-Identifier: BSL-1.0
#pragma once

// A barge on a head line and softer spring lines, in surge alone: two minutes of a storm, step by step.
// Units: s, m, t, kN. The barge is invented.

#include <algorithm>
#include <array>
#include <cmath>
#include <cstddef>

#include <steelyard/core.hpp>

namespace mooring {

inline constexpr double mass = 4000.0;         // t, with the water that moves along
inline constexpr double springs = 200.0;       // kN/m, the other lines together
inline constexpr double damping = 290.0;       // kN s/m, 8 % of critical
inline constexpr double force_per_metre = 180.0;  // kN of wave force for each metre of wave amplitude
inline constexpr double air_density = 1.225e-3;   // t/m3
inline constexpr double rated_load = 1500.0;      // kN

inline constexpr std::size_t components = 20;  // of the sea, 0.3 to 1.3 rad/s
inline constexpr double first_frequency = 0.3, frequency_step = 0.05;
inline constexpr std::size_t steps = 400;
inline constexpr double step = 0.3;  // s: two minutes in all, after which this sea would come again

/// What is not known, of the mooring and of the next storm, and what came of it.
struct state {
  double pretension;   // kN
  double stiffness;    // kN/m, of the head line
  double windage;      // m2, drag coefficient times area
  double wave_height;  // m, significant
  double period;       // s, at the peak of the spectrum
  double wind;         // m/s
  double peak;         // kN, largest load of the head line
  double when;         // s, at which it came
  double slack;        // share of the time without load
};

inline double wind_force(double windage, double speed) { return 0.5 * air_density * windage * speed * speed; }

/// Load of the head line in steady wind on a calm sea (kN).
inline double steady_load(state const& s, double wind) {
  return s.pretension + s.stiffness / (s.stiffness + springs) * wind_force(s.windage, wind);
}

/// Spectrum of a wind sea by significant height and peak frequency.
///   S = 5/16 H^2 p^4 w^-5 e^(-5/4 (p/w)^4)          [Pierson & Moskowitz, J. Geophys. Res. 69, 1964; Bretschneider 1959]
inline double spectrum(double w, double height, double peak) {
  double const r = peak / w, r4 = r * r * r * r;
  return 0.3125 * height * height * r4 / w * std::exp(-1.25 * r4);
}

/// m x'' = F(t) - c x' - k_s x - (T - T_0), T = max(0, T_0 + k x): the line pulls when taut and does nothing when slack.
/// Steps update velocity before place (semi-implicit Euler), from rest in steady wind.
/// @param waves  a standard normal pair for each component of the sea
inline void ride(state& s, std::array<double, 2 * components> const& waves) {
  std::array<double, components> cosine{}, sine{}, turn_c{}, turn_s{};
  double const peak = 2.0 * 3.14159265358979324 / s.period;
  for (std::size_t i = 0; i < components; ++i) {
    double const w = first_frequency + frequency_step * (static_cast<double>(i) + 0.5);
    double const sd = force_per_metre * std::sqrt(spectrum(w, s.wave_height, peak) * frequency_step);
    cosine[i] = sd * waves[2 * i];
    sine[i] = sd * waves[2 * i + 1];
    turn_c[i] = std::cos(w * step);
    turn_s[i] = std::sin(w * step);
  }
  double const steady = wind_force(s.windage, s.wind);
  double x = steady / (s.stiffness + springs), v = 0.0;
  s.peak = s.when = s.slack = 0.0;
  for (std::size_t n = 0; n < steps; ++n) {
    double force = steady;
    for (std::size_t i = 0; i < components; ++i) {
      force += cosine[i];
      double const c = cosine[i] * turn_c[i] + sine[i] * turn_s[i];
      sine[i] = sine[i] * turn_c[i] - cosine[i] * turn_s[i];
      cosine[i] = c;
    }
    double const load = std::max(0.0, s.pretension + s.stiffness * x);
    if (load > s.peak) s.peak = load, s.when = step * static_cast<double>(n);
    if (load == 0.0) s.slack += 1.0 / static_cast<double>(steps);
    v += step / mass * (force - damping * v - springs * x - (load - s.pretension));
    x += step * v;
  }
}

/// The simulator: draws mooring, storm and sea, one word for each, and rides it out.
inline state simulate(steelyard::draws& draws) {
  state s{};
  s.pretension = draws.normal(150.0, 30.0);
  s.stiffness = 600.0 * std::exp(draws.normal(0.0, 0.15));
  s.windage = 900.0 * std::exp(draws.normal(0.0, 0.30));
  s.wave_height = 2.6 * std::exp(draws.normal(0.0, 0.20));
  s.period = 4.2 * std::sqrt(s.wave_height) * std::exp(draws.normal(0.0, 0.08));
  s.wind = 18.0 * std::exp(draws.normal(0.0, 0.15));
  std::array<double, 2 * components> waves{};
  for (double& each : waves) each = draws.normal();
  ride(s, waves);
  return s;
}

}  // namespace mooring
