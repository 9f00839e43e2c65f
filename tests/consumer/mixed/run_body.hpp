// SPDX-License-Identifier: BSL-1.0
// Body of strict_run and fast_run: the text is one, the flags are two.
  namespace sy = steelyard;
  auto reading = [](double x) {
    double const z = (0.35 - x * x) / 0.15;
    return sy::log_likelihood{-0.5 * z * z};
  };
  auto refuses = [&](auto weighter) {
    try {
      (void)sy::pipeline{sampler, weighter}.run({.size = 2'000, .seed = 1});
    } catch (sy::error const&) {
      return true;
    }
    return false;
  };
  auto const sample = sy::pipeline{sampler, reading}.run({.size = 50'000, .seed = 1, .threads = 2});
  sy::estimate const square = sample.expectation([](double x) { return x * x; });
  sy::estimate const right = sample.probability([](double x) { return x > 0.0; });
  sy::estimate const never = sample.probability([](double x) { return x > 2.0; });
  auto const half =
      sy::pipeline{sampler, [](double x) { return sy::likelihood{x > 0.0 ? 1.0 : 0.0}; }}.run({.size = 50'000, .seed = 1});
  findings found{};
  found.mean = square.value;
  found.standard_error = square.standard_error;
  found.chance = right.value;
  found.sound = square.verdict() == sy::verdict::sound;
  found.never_seen = never.value == 0.0 && never.verdict() == sy::verdict::broken && never.error_interval(0.95).upper > 0.0;
  found.zero_refused = refuses([](double) { return sy::likelihood{0.0}; });
  found.nan_refused = refuses([](double) { return sy::log_likelihood{not_a_number()}; });
  found.infinite_refused = refuses([](double) { return sy::log_likelihood{infinity()}; });
  found.half_impossible = half.diagnosis().effective_size() / 50'000;
  return found;
