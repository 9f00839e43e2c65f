// SPDX-License-Identifier: BSL-1.0
// Results of every kind in hex: the same bits with the vector kernels and without.
#include <array>
#include <bit>
#include <cstdint>
#include <cstdio>
#include <vector>

#include <steelyard/core.hpp>

namespace sy = steelyard;

namespace {

void put(char const* what, double x) {
  std::printf("%-14s %016llx\n", what, static_cast<unsigned long long>(std::bit_cast<std::uint64_t>(x)));
}
void put(char const* what, sy::estimate const& e) {
  put(what, e.value);
  put(what, e.standard_error);
  put(what, e.carriers);
}

}  // namespace

int main() {
  auto sampler = [](sy::draws& d) {
    std::array<double, 3> x{};
    for (double& each : x) each = d.normal();
    return x;
  };
  using state = std::array<double, 3>;
  auto weighter = [](state const& x) {
    double const z = (0.8 - x[0] - 0.3 * x[1]) / 0.4;
    return x[2] > 2.5 ? sy::log_likelihood{sy::detail::impossible} : sy::log_likelihood{-0.5 * z * z};
  };
  auto first = [](state const& x) { return x[0]; };
  auto second = [](state const& x) { return x[1]; };
  sy::pipeline pipe{sampler, weighter};
  for (std::size_t const size : {777u, 50'001u}) {
    auto const sample = pipe.run({.size = size, .seed = 4});
    put("mean", sample.expectation(first));
    auto const all = sample.expectation([](state const& x) { return x; });
    put("covariance", all.covariance(0, 1));
    put("chance", sample.probability([](state const& x) { return x[0] > 1.0; }));
    auto const bars = sample.histogram(first, sy::equal_bins(-1.0, 2.0, 7));
    for (std::size_t b = 0; b < bars.size(); ++b) put("bar", bars.probability(b));
    put("edges", sample.histogram(second).edge(2));
    put("median", static_cast<sy::estimate const&>(sample.quantile(first, 0.5)));
    put("evidence", sample.log_evidence());
    put("ratio", sample.ratio(first, [](state const& x) { return 2.0 + x[1]; }));
    auto const [spread, both, steps, middle] = sample.estimate(
        sy::moments(first), sy::covariance([](state const& x) { return std::array{x[0], x[1]}; }), sy::cumulative(first, {0.0, 0.5}),
        sy::coverage_interval(second, 0.9));
    put("deviation", spread.sd);
    put("kurtosis", spread.kurtosis);
    put("entry", both(0, 1));
    put("correlation", both.correlation(1, 0));
    for (sy::estimate const& each : steps.shares) put("step", each);
    put("lower", static_cast<sy::estimate const&>(middle.lower));
    put("size", sample.diagnosis().effective_size());
    put("perplexity", sample.diagnosis().perplexity());
    put("drawn again", sample.resample(400, {.seed = 2}).expectation(first));
    put("independent", sample.resample(400, {.seed = 2, .scheme = sy::scheme::multinomial}).expectation(first));
    auto const [mean, evidence] = pipe.estimate({.size = size, .seed = 4}, sy::expectation(second), sy::log_evidence());
    put("one pass", mean);
    put("one pass", evidence);
  }
  return 0;
}
