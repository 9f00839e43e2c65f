// SPDX-License-Identifier: BSL-1.0
// What tempered runs and low probabilities reach, a row for each case, beside figures of a method tried before:
//   tempered_table [--repeats N] [--only TEXT]          200 repeats a row unless told; each has a seed of its own, from 1
// A row gives the mean number of calls of the sampler and the root mean square error of the log-evidence (or of the
// log-probability), both with 99.9 % limits, and how often nominal 95 % error intervals cover. "better" and "worse" are
// said where the whole of the limits lies on that side of the figure beside it, which is rounded to a thousand calls and
// to a hundredth. How sharp the readings of the rows "two modes", "banana" and "Poisson" were then is not known, so those
// rows stand at two shares, between or beyond which the earlier case lies, and say "not the same case". Called by the
// benches' test it makes two repeats. `--only TEXT` leaves out rows whose name does not hold the text.

#include <array>
#include <cmath>
#include <cstddef>
#include <cstdint>
#include <cstdio>
#include <cstdlib>
#include <functional>
#include <random>
#include <string>
#include <string_view>
#include <vector>

#include <steelyard/tempered.hpp>

namespace sy = steelyard;

namespace {

constexpr double pi = 3.14159265358979324;

/// What one run came to.
struct outcome {
  double error = 0.0, calls = 0.0;
  bool covered = false, mean_covered = false, sound = false, mean_known = false;
};
struct row {
  std::string name, share;
  std::function<outcome(std::uint64_t)> run;
  double calls_before, error_before;
  bool same_case = true;  ///< as sharp as the case whose figures stand beside it
};

bool covers(sy::interval const& i, double truth) { return i.lower_known && i.upper_known && i.lower <= truth && truth <= i.upper; }

/// A tempered run beside the exact log-evidence, and, where known, the exact mean of a readout.
template <class Sampler, class Weighter, class Readout>
outcome tempered(Sampler const& sampler, Weighter const& weighter, std::uint64_t seed, double log_z, Readout const& readout, double const* mean) {
  auto const sample = sy::run_tempered(sy::pipeline{sampler, weighter}, {.seed = seed});
  auto const z = sample.log_evidence();
  outcome o;
  o.error = z.value - log_z;
  o.calls = static_cast<double>(sample.sampler_calls());
  o.covered = covers(z.error_interval(0.95), log_z);
  o.sound = z.verdict() == sy::verdict::sound;
  if (mean != nullptr) {
    o.mean_known = true;
    o.mean_covered = covers(sample.expectation(readout).error_interval(0.95), *mean);
  }
  return o;
}

/// Share of the effective size that plain weighting keeps of d normal deviates, each read as 0.5 with deviation s:
///   per deviate (E w)^2 / E w^2 with E w = N(0.5; 0, 1 + s^2), E w^2 = N(0.5; 0, 1 + s^2/2) / (2 s sqrt(pi))
double log_share(double s, double d) {
  auto const log_normal = [](double variance) { return -0.5 * 0.25 / variance - 0.5 * std::log(2.0 * pi * variance); };
  return d * (2.0 * log_normal(1.0 + s * s) - log_normal(1.0 + 0.5 * s * s) + std::log(2.0 * s * std::sqrt(pi)));
}
double sd_for(double share, std::size_t d) {
  double low = 1e-15, high = 10.0;
  for (int i = 0; i < 200; ++i) {
    double const middle = std::sqrt(low * high);
    (log_share(middle, static_cast<double>(d)) < std::log(share) ? low : high) = middle;
  }
  return low;
}

template <std::size_t D>
row conjugate(double share, double calls, double error) {
  using state = std::array<double, D>;
  double const s = sd_for(share, D);
  return {"conjugate normal, d = " + std::to_string(D), "", [s](std::uint64_t seed) {
            auto const sampler = [](sy::draws& draws) {
              state x{};
              for (double& v : x) v = draws.normal();
              return x;
            };
            auto const weighter = [s](state const& x) {
              double q = 0.0;
              for (double const v : x) q += (0.5 - v) * (0.5 - v);
              return sy::log_likelihood{-0.5 * q / (s * s)};
            };
            double const log_z = 0.5 * static_cast<double>(D) * (std::log(s * s / (1.0 + s * s)) - 0.25 / (1.0 + s * s));
            double const mean = 0.5 / (1.0 + s * s);
            return tempered(sampler, weighter, seed, log_z, [](state const& x) { return x[0]; }, &mean);
          },
          calls, error};
}

row by_rejection(double share, double calls, double error) {
  using state = std::array<double, 4>;
  double const s = sd_for(share, 4);
  return {"d = 4, std::normal_distribution", "", [s](std::uint64_t seed) {
            auto const sampler = [](sy::draws& draws) {
              std::normal_distribution<double> law;
              state x{};
              for (double& v : x) v = law(draws);
              return x;
            };
            auto const weighter = [s](state const& x) {
              double q = 0.0;
              for (double const v : x) q += (0.5 - v) * (0.5 - v);
              return sy::log_likelihood{-0.5 * q / (s * s)};
            };
            double const log_z = 2.0 * (std::log(s * s / (1.0 + s * s)) - 0.25 / (1.0 + s * s));
            double const mean = 0.5 / (1.0 + s * s);
            return tempered(sampler, weighter, seed, log_z, [](state const& x) { return x[0]; }, &mean);
          },
          calls, error};
}

/// One number u of density f at y, read as y: share 2 s sqrt(pi) f(y), evidence s sqrt(2 pi) f(y), both to order s^2.
template <class Sampler, class Number>
row sharp(std::string name, Sampler sampler, Number number, double y, double density, double share, double calls, double error) {
  double const s = share / (2.0 * std::sqrt(pi) * density);
  return {std::move(name), "", [=](std::uint64_t seed) {
            auto const weighter = [=](auto const& x) {
              double const z = (y - number(x)) / s;
              return sy::log_likelihood{-0.5 * z * z};
            };
            return tempered(sampler, weighter, seed, std::log(s * std::sqrt(2.0 * pi) * density), number, &y);
          },
          calls, error, false};
}

double normal_density(double x) { return std::exp(-0.5 * x * x) / std::sqrt(2.0 * pi); }

row two_modes(double share) {
  return sharp("x^2 read, two modes", [](sy::draws& draws) { return draws.normal(); }, [](double x) { return x * x; }, 1.0, normal_density(1.0),
               share, 71e3, 0.07);
}
row banana(double share) {
  using state = std::array<double, 2>;
  // Density of x1 + x0^2 at 1.
  double density = 0.0;
  for (int i = -8000; i < 8000; ++i) {
    double const x = (i + 0.5) * 1e-3;
    density += 1e-3 * normal_density(x) * normal_density(1.0 - x * x);
  }
  return sharp("banana: x1 + x0^2 read", [](sy::draws& draws) { return state{draws.normal(), draws.normal()}; },
               [](state const& x) { return x[1] + x[0] * x[0]; }, 1.0, density, share, 63e3, 0.065);
}
row compound(double mean, double share, double calls, double error) {
  // Density of the sum at y: e^-(mean + y) sum_k mean^k y^(k-1) / (k! (k-1)!), k >= 1.
  double const y = mean;
  double density = 0.0;
  for (int k = 1; k < 200; ++k)
    density += std::exp(-mean - y + k * std::log(mean) + (k - 1) * std::log(y) - std::lgamma(k + 1.0) - std::lgamma(k));
  auto const sampler = [mean](sy::draws& draws) {
    double left = mean, sum = 0.0;
    while ((left += std::log(draws.uniform())) > 0.0) sum += draws.exponential(1.0);
    return sum;
  };
  return sharp("Poisson number of exponentials, mean " + std::to_string(static_cast<int>(mean)), sampler, [](double x) { return x; }, y, density,
               share, calls, error);
}

row rare(double beta, double calls, double error) {
  return {"P(sum / sqrt(100) > " + std::to_string(static_cast<int>(beta)) + "), 320 chains", "", [beta](std::uint64_t seed) {
            auto const sampler = [](sy::draws& draws) {
              double sum = 0.0;
              for (int i = 0; i < 100; ++i) sum += draws.normal();
              return sum;
            };
            auto const p = sy::low_probability(sampler, [beta](double sum) { return 0.1 * sum - beta; }, {.seed = seed, .chains = 320});
            double const exact = 0.5 * std::erfc(beta / std::sqrt(2.0));
            outcome o;
            o.error = std::log(p.value / exact);
            o.calls = static_cast<double>(p.sampler_calls());
            o.covered = covers(p.error_interval(0.95), exact);
            o.sound = p.verdict() == sy::verdict::sound;
            return o;
          },
          calls, error};
}

std::vector<row> table() {
  std::vector<row> rows;
  auto const put = [&](row r, char const* share) {
    r.share = share;
    rows.push_back(std::move(r));
  };
  put(conjugate<1>(1e-6, 58e3, 0.08), "1e-6");
  put(conjugate<1>(1e-12, 109e3, 0.09), "1e-12");
  put(conjugate<4>(1e-6, 40e3, 0.06), "1e-6");
  put(conjugate<4>(1e-12, 74e3, 0.11), "1e-12");
  put(conjugate<16>(1e-6, 31e3, 0.07), "1e-6");
  put(conjugate<16>(1e-12, 52e3, 0.08), "1e-12");
  for (double const share : {1e-3, 1e-6}) {
    char const* const said = share > 1e-5 ? "1e-3" : "1e-6";
    put(two_modes(share), said);
    put(banana(share), said);
    put(compound(5.0, share, 134e3, 0.07), said);
    put(compound(20.0, share, 179e3, 0.09), said);
  }
  put(rare(5.0, 126e3, 0.14), "2.9e-7");
  put(rare(6.0, 172e3, 0.19), "9.9e-10");
  put(by_rejection(1e-6, 310e3, 0.09), "1e-6");
  put(conjugate<64>(1e-6, 179e3, 0.07), "1e-6");
  put(conjugate<64>(1e-12, 291e3, 0.08), "1e-12");
  return rows;
}

void print(row const& r, std::uint64_t repeats) {
  double calls = 0.0, calls_squares = 0.0, squares = 0.0, fourth = 0.0;
  int covered = 0, mean_covered = 0, sound = 0;
  bool mean_known = false;
  for (std::uint64_t seed = 1; seed <= repeats; ++seed) {
    outcome const o = r.run(seed);
    calls += o.calls;
    calls_squares += o.calls * o.calls;
    squares += o.error * o.error;
    fourth += o.error * o.error * o.error * o.error;
    covered += o.covered ? 1 : 0;
    mean_covered += o.mean_covered ? 1 : 0;
    sound += o.sound ? 1 : 0;
    mean_known = o.mean_known;
  }
  double const n = static_cast<double>(repeats), mean = squares / n;
  double const reach = 3.2905 * std::sqrt(std::fmax(0.0, fourth / n - mean * mean) / n);
  double const low = std::sqrt(std::fmax(0.0, mean - reach)), high = std::sqrt(mean + reach);
  double const mean_calls = calls / n;
  double const calls_reach = 3.2905 * std::sqrt(std::fmax(0.0, calls_squares / n - mean_calls * mean_calls) / n);
  auto const said = [&r](double least, double most, double before, double rounding) {
    if (!r.same_case) return "not the same case";
    return most < before - rounding ? "better" : least > before + rounding ? "worse" : "as before";
  };
  std::printf("| %s | %s | %.1fk +- %.1fk | %.0fk | %s | %.3f (%.3f to %.3f) | %.3f | %s | %.3f | ", r.name.c_str(), r.share.c_str(), mean_calls / 1e3, calls_reach / 1e3,
              r.calls_before / 1e3, said(mean_calls - calls_reach, mean_calls + calls_reach, r.calls_before, 500.0), std::sqrt(mean), low, high, r.error_before,
              said(low, high, r.error_before, 0.005), covered / n);
  if (mean_known)
    std::printf("%.3f", mean_covered / n);
  std::printf(" | %.2f |\n", sound / n);
  std::fflush(stdout);
}

}  // namespace

int main(int argc, char** argv) {
  std::uint64_t repeats = 200;
  std::string_view only = "";
  for (int i = 1; i < argc; ++i) {
    std::string_view const word = argv[i];
    if (word.starts_with("--benchmark_")) repeats = 2;
    if (word == "--repeats" && i + 1 < argc) repeats = std::strtoull(argv[++i], nullptr, 10);
    if (word == "--only" && i + 1 < argc) only = argv[++i];
  }
  if (repeats < 2) {
    std::fprintf(stderr, "tempered_table: --repeats takes a whole number from 2\n");
    return 2;
  }
  std::printf("%llu repeats a row\n\n", static_cast<unsigned long long>(repeats));
  std::printf("| case | plain effective share | calls (99.9 %% limits) | before | | RMSE (99.9 %% limits) | before | | evidence covered | mean covered | sound |\n");
  std::printf("|---|---|---|---|---|---|---|---|---|---|---|\n");
  for (row const& r : table())
    if (r.name.find(only) != std::string::npos) print(r, repeats);
}
