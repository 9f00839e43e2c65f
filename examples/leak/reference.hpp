// SPDX-License-Identifier: BSL-1.0
#pragma once

// The same posterior by quadrature, to check the weighted answer with: no random number, no iteration, no library.
//   The leak flow q takes the place of the opening A = q / (C sqrt(2 p / density)), p the pressure at the leak, so that
//   everything follows in closed form; the prior of q at fixed other unknowns is that of log A times
//     d(log A)/dq = 1/q + x g'(q) / (2 p),   g' the derivative of the pressure gradient upstream.
//   The inlet pressure is integrated out: both loggers are normal about it. Its mean given the readings stands for it
//   in the factor above, which moves it by less than 1e-5. A display cell of width h has the probability h times a
//   normal density of variance sd^2 + h^2/12, to (h/sd)^4.
// On the shipped readings twice as many nodes in every direction change no chance by more than 1e-8.

#include <algorithm>
#include <array>
#include <cmath>
#include <cstddef>
#include <stdexcept>
#include <utility>
#include <vector>

#include <boost/math/quadrature/gauss.hpp>

#include "model.hpp"

namespace leak {

struct reference {
  double log_evidence = 0.0;
  std::vector<double> section;     // chance of each 100 m
  std::vector<double> flow_below;  // chance that the leak flow is below each of the flows asked for
  double mean_leak_flow = 0.0;     // L/s
};

namespace detail {

using nodes = std::vector<std::pair<double, double>>;  // place and weight

/// Gauss-Legendre nodes on each stretch between neighbouring edges, cut to pieces no longer than `longest`.
template <unsigned N>
nodes panels(std::vector<double> const& edges, double longest) {
  using rule = boost::math::quadrature::gauss<double, N>;
  nodes all;
  for (std::size_t e = 0; e + 1 < edges.size(); ++e) {
    double const pieces = std::ceil((edges[e + 1] - edges[e]) / longest);
    double const half = 0.5 * (edges[e + 1] - edges[e]) / pieces;
    for (double k = 0.0; k < pieces; ++k)
      for (std::size_t i = 0; i < rule::abscissa().size(); ++i)
        for (double const side : {-1.0, 1.0}) {
          double const at = edges[e] + half * (2.0 * k + 1.0 + side * rule::abscissa()[i]);
          all.emplace_back(at, half * rule::weights()[i]);
        }
  }
  return all;
}

/// Evenly spaced deviates of a standard normal variable, weighted by its density.
inline nodes normal_nodes(double step) {
  nodes all;
  for (double z = -5.5; z < 5.5 + 0.5 * step; z += step)
    all.emplace_back(z, step * std::exp(-0.5 * z * z) / std::sqrt(2.0 * 3.14159265358979324));
  return all;
}

}  // namespace detail

/// @param flows  rising leak flows (L/s) at which the cumulative chance is wanted, near the meter's reading
inline reference by_quadrature(readings const& read, std::vector<double> const& flows) {
  double const two_pi = 2.0 * 3.14159265358979324;
  double const v = logger_sd * logger_sd + display_step * display_step / 12.0;
  double const t = inlet_pressure_sd * inlet_pressure_sd;
  double const determinant = v * v + 2.0 * v * t, log_range = std::log(largest_opening / smallest_opening);
  double const x1 = read.logger_1.position, x2 = read.logger_2.position;

  std::vector<double> cuts{x1, x2};
  for (double x = 0.0; x < length + 0.5 * section; x += section) cuts.push_back(x);
  std::sort(cuts.begin(), cuts.end());
  cuts.erase(std::unique(cuts.begin(), cuts.end()), cuts.end());
  detail::nodes const positions = detail::panels<8>(cuts, section);

  double const first = std::max(0.05, read.meter.value - 6.5 * meter_sd), last = read.meter.value + 6.5 * meter_sd;
  std::vector<double> edges{first};
  edges.insert(edges.end(), flows.begin(), flows.end());
  edges.push_back(last);
  if (!std::is_sorted(edges.begin(), edges.end())) throw std::domain_error("by_quadrature: the flows must rise");

  reference answer;
  answer.section.assign(static_cast<std::size_t>(length / section + 0.5), 0.0);
  detail::nodes const deviates = detail::normal_nodes(0.25);
  double total = 0.0, flow_sum = 0.0;
  for (std::size_t e = 0; e + 1 < edges.size(); ++e) {
    for (auto const& [q, q_weight] : detail::panels<6>({edges[e], edges[e + 1]}, 1.5 * meter_sd)) {
      double const miss = (read.meter.value - q) / meter_sd;
      double const meter = std::exp(-0.5 * miss * miss) / (meter_sd * std::sqrt(two_pi));
      for (auto const& [z_roughness, roughness_weight] : deviates) {
        pipe const along{length, inside_diameter, 1e-3 * median_roughness * std::exp(log_roughness_sd * z_roughness)};
        for (auto const& [z_demand, demand_weight] : deviates) {
          double const demand = usual_demand + demand_sd * z_demand;
          auto const gradient = [&](double flow) { return 1e-3 * pressure_gradient(1e-3 * flow, along, hot_water); };
          double const down = gradient(demand), up = gradient(demand + q);
          double const slope = (gradient(demand + q + 1e-3) - gradient(demand + q - 1e-3)) / 2e-3;
          double const weight = q_weight * meter * roughness_weight * demand_weight / (log_range * length);
          for (auto const& node : positions) {
            double const x = node.first, x_weight = node.second;
            auto const lost = [&](double at) { return at < x ? up * at : up * x + down * (at - x); };
            double const a = read.logger_1.value + lost(x1) - set_inlet_pressure;
            double const b = read.logger_2.value + lost(x2) - set_inlet_pressure;
            double const square = ((a * a + b * b) * (v + t) - 2.0 * t * a * b) / determinant;
            if (square > 80.0) continue;
            double const inlet = set_inlet_pressure + (a + b) * t / (v + 2.0 * t), at_leak = inlet - up * x;
            double const opening =
                1e4 * 1e-3 * q / (discharge_coefficient * std::sqrt(2e3 * at_leak / hot_water.density));
            if (!(opening >= smallest_opening && opening <= largest_opening)) continue;
            double const part = weight * x_weight * (1.0 / q + 0.5 * x * slope / at_leak) * std::exp(-0.5 * square);
            total += part;
            flow_sum += part * q;
            answer.section[std::min(answer.section.size() - 1, static_cast<std::size_t>(x / section))] += part;
          }
        }
      }
    }
    if (e < flows.size()) answer.flow_below.push_back(total);
  }
  for (double& each : answer.section) each /= total;
  for (double& each : answer.flow_below) each /= total;
  answer.mean_leak_flow = flow_sum / total;
  answer.log_evidence = std::log(total * display_step * display_step / (two_pi * std::sqrt(determinant)));
  return answer;
}

}  // namespace leak
