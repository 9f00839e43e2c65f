// SPDX-License-Identifier: BSL-1.0
// The parts of examples/leak on their own: hydraulics beside textbook values, the reader beside right and wrong files.
// Writes small files into the working directory; returns 0 where all holds.

#include <cmath>
#include <cstddef>
#include <fstream>
#include <functional>
#include <iostream>
#include <stdexcept>
#include <string>

#include "../leak/check.hpp"
#include "../leak/csv.hpp"
#include "../leak/hydraulics.hpp"
#include "../leak/model.hpp"
#include "../leak/options.hpp"
#include "../leak/page.hpp"
#include "../leak/readings.hpp"

namespace {

int checked = 0, failed = 0;

void holds(bool true_here, std::string const& what) {
  ++checked;
  if (true_here) return;
  ++failed;
  std::cout << "does not hold: " << what << '\n';
}

void near(double value, double expected, double relative, std::string const& what) {
  holds(std::abs(value - expected) <= relative * std::abs(expected),
        what + ": " + std::to_string(value) + " beside " + std::to_string(expected));
}

/// Whether a call throws an error with these words in it.
template <class Error>
void refuses(std::function<void()> const& call, std::string const& words) {
  std::string said = "nothing was thrown";
  try {
    call();
  } catch (Error const& problem) {
    said = problem.what();
    if (said.find(words) != std::string::npos && said.find('\n') == std::string::npos) return holds(true, words);
  } catch (std::exception const& problem) {
    said = std::string("another kind: ") + problem.what();
  }
  holds(false, "\"" + words + "\"; instead: " + said);
}

/// 1/sqrt(f) = -2 log10(k/3.7 + 2.51/(Re sqrt(f)))                     [Colebrook, J. Inst. Civ. Eng. 11, 1939, 133]
double colebrook(double reynolds, double relative_roughness) {
  double x = 7.0;
  for (int i = 0; i < 100; ++i) x = -2.0 * std::log10(relative_roughness / 3.7 + 2.51 * x / reynolds);
  return 1.0 / (x * x);
}

void friction() {
  // Problem 0.2 of the supplement to "Surge Analysis and the Wave Plan Method" (kypipe.com): 300 mm, 0.12 mm, 2 m/s,
  // 1e-6 m2/s give f = 0.0169 and 0.0689 m lost over 6 m, both to three digits.
  leak::fluid const cold{1000.0, 1e-6};
  leak::pipe const ductile{6.0, 0.3, 0.00012};
  near(leak::friction_factor(6e5, 0.0004), 0.0169, 0.5e-4 / 0.0169, "friction factor of the worked problem");
  double const flow = 2.0 * 0.25 * 3.14159265358979 * 0.3 * 0.3;
  near(leak::pressure_gradient(flow, ductile, cold) * 6.0 / (1000.0 * 9.81), 0.0689, 3e-3,
       "head lost in the worked problem");
  // White, Fluid Mechanics, the asphalted cast-iron example (from memory): Re 270 000, roughness 0.0008 D, Moody chart
  // 0.02.
  near(leak::friction_factor(2.7e5, 0.0008), 0.02, 0.02, "friction factor off the Moody chart");
  // The formula promises about 1 % of Colebrook's; over this range 1.1 % is the worst, by 30-digit arithmetic.
  for (double reynolds = 5e4; reynolds < 2.1e6; reynolds *= 1.3)
    for (double roughness = 1e-4; roughness < 1.1e-2; roughness *= 1.3)
      near(leak::friction_factor(reynolds, roughness), colebrook(reynolds, roughness), 0.012,
           "Swamee-Jain beside Colebrook");
  // The healthy main at 15 L/s and 0.1 mm by 30-digit arithmetic: v 1.087852 m/s, Re 394 905, Colebrook f 0.01926382,
  // 100.342 kPa over 1200 m; Swamee-Jain f 0.01939170, 101.008 kPa.
  leak::pipe const main_pipe{leak::length, leak::inside_diameter, 1e-4};
  near(leak::velocity(0.015, leak::inside_diameter), 1.08785151561566, 1e-12, "velocity");
  near(1e-3 * leak::length * leak::pressure_gradient(0.015, main_pipe, leak::hot_water), 101.008220935121, 1e-9,
       "healthy main");
  near(1e-3 * leak::length * leak::pressure_gradient(0.015, main_pipe, leak::hot_water), 100.342133543698, 0.01,
       "by Colebrook");
  refuses<std::domain_error>([] { leak::friction_factor(2000.0, 1e-3); }, "5e3 to 1e8");
}

void orifice() {
  // 1 cm2 under 500 kPa of cold water: sqrt(2 p / density) = 31.6228 m/s, times 0.61 cm2 (by hand).
  near(leak::orifice_flow(1e-4, 5e5, {1000.0, 1e-6}), 0.61e-4 * 31.6227766, 1e-8, "orifice");
  // Sharp-edged openings: 0.60 to 0.62 in handbooks (common practice).
  holds(leak::discharge_coefficient >= 0.60 && leak::discharge_coefficient <= 0.62, "discharge coefficient");
  holds(leak::orifice_flow(1e-4, -1.0, {1000.0, 1e-6}) == 0.0, "nothing is drawn in");
}

/// The leak flow by bisection: f(q) = q - orifice(p - gradient(demand + q) x) rises with q.
double by_bisection(leak::pipe const& along, double inlet, double demand, double position, double opening) {
  double low = 0.0, high = leak::orifice_flow(opening, inlet, leak::hot_water);
  for (int i = 0; i < 200; ++i) {
    double const q = 0.5 * (low + high);
    double const there = inlet - leak::pressure_gradient(demand + q, along, leak::hot_water) * position;
    (q < leak::orifice_flow(opening, there, leak::hot_water) ? low : high) = q;
  }
  return 0.5 * (low + high);
}

void steady() {
  // Every corner of what is drawn, six standard deviations out.
  for (double const position : {0.0, 1.0, 600.0, 1200.0})
    for (double const opening : {leak::smallest_opening, 1.0, leak::largest_opening})
      for (double const z : {-6.0, 0.0, 6.0})
        for (double const z2 : {-6.0, 6.0}) {
          double const roughness = leak::median_roughness * std::exp(z * leak::log_roughness_sd);
          double const demand = leak::usual_demand + z2 * leak::demand_sd;
          double const inlet = leak::set_inlet_pressure - z2 * leak::inlet_pressure_sd;
          leak::state const s = leak::settle(position, opening, roughness, demand, inlet);
          leak::pipe const along{leak::length, leak::inside_diameter, 1e-3 * roughness};
          near(s.leak_flow, 1e3 * by_bisection(along, 1e3 * inlet, 1e-3 * demand, position, 1e-4 * opening), 1e-8,
               "leak flow");
          near(1e-3 * s.leak_flow, leak::orifice_flow(1e-4 * opening, 1e3 * s.pressure_at(position), leak::hot_water),
               1e-8, "the flow fits the pressure at the leak");
          holds(s.pressure_at(0.0) == inlet && s.loss_upstream > s.loss_downstream, "upstream flows more");
          near(s.pressure_at(position + 1e-6), s.pressure_at(position), 1e-6, "the pressure has no step at the leak");
        }
  // A narrow pipe, where the leak takes nearly all of the pressure that friction has left and plain substitution
  // swings.
  for (double const diameter : {0.076, 0.08, 0.1})
    for (double const opening : {1e-5, 1e-4, 3e-4, 3e-3}) {
      leak::pipe const narrow{leak::length, diameter, 1e-4};
      near(leak::solve(narrow, leak::hot_water, 6e5, 0.008, 1200.0, opening).leak_flow,
           by_bisection(narrow, 6e5, 0.008, 1200.0, opening), 1e-8, "leak flow in a narrow pipe");
    }
  leak::pipe const too_narrow{leak::length, 0.04, 1e-4};
  refuses<std::domain_error>([&] { leak::solve(too_narrow, leak::hot_water, 6e5, 0.008, 1200.0, 3e-4); },
                             "used up by friction");
}

/// The shipped readings are what the instruments draw from the true state, in the order of the file, at seed 1.
void invented(std::string const& path) {
  namespace sy = steelyard;
  leak::csv_file const file(path);
  leak::readings const read = leak::readings_from(file);
  leak::state const truth = leak::true_state(file);
  sy::draws draws(1);
  auto const logger = sy::rounded(leak::display_step, sy::normal_noise(leak::logger_sd));
  near(logger.draw(truth.pressure_at(read.logger_1.position), draws), read.logger_1.value, 1e-12, "logger 1");
  near(logger.draw(truth.pressure_at(read.logger_2.position), draws), read.logger_2.value, 1e-12, "logger 2");
  double const meter = sy::normal_noise(leak::meter_sd).draw(truth.leak_flow, draws);
  holds(std::abs(meter - read.meter.value) <= 0.005 + 1e-12, "the meter, to the two decimals of the file");
}

leak::csv_file file_of(std::string const& text) {
  { std::ofstream("reader_test.csv", std::ios::binary) << text; }
  return leak::csv_file("reader_test.csv");
}

void reader() {
  auto const fine = file_of(
      "\xEF\xBB\xBF# a comment, with a comma\r\n\r\n name ,\"the, value\" , x\r\n a b ,\"say \"\"so\"\"\",+1.5e2\r\n");
  holds(fine.comments().size() == 1 && fine.comments()[0] == "a comment, with a comma", "comments");
  holds(fine.rows().size() == 1 && fine.rows()[0].line == 4, "rows know their line");
  holds(fine.rows()[0].fields[fine.column("name")] == "a b", "spaces are cut");
  holds(fine.rows()[0].fields[fine.column("the, value")] == "say \"so\"", "quoted fields");
  holds(fine.number(fine.rows()[0], fine.column("x")) == 150.0, "numbers");
  holds(file_of("a,b\n1,").rows()[0].fields[1].empty(), "an empty last field, no end of line");

  using leak::bad_file;
  refuses<bad_file>([] { leak::csv_file("no_such.csv"); }, "no_such.csv: there is no such file");
  refuses<bad_file>([] { leak::csv_file("."); }, "is a folder");
  refuses<bad_file>([] { file_of(""); }, "reader_test.csv: the file is empty");
  refuses<bad_file>([] { file_of("# only\n\n"); }, "the file is empty");
  refuses<bad_file>([] { file_of("a,b\n"); }, "no row behind it");
  refuses<bad_file>([] { file_of("a,b\n1,2,3\n"); }, "line 2: fields in this row: 3, columns in the header: 2");
  refuses<bad_file>([] { file_of("a,b\n1\n"); }, "line 2: fields in this row: 1, columns in the header: 2");
  refuses<bad_file>([] { file_of("a,b\n\"1,2\n"); }, "line 2: a quotation mark is opened");
  refuses<bad_file>([] { file_of("a,b\n\"1\"2,3\n"); }, "line 2: something stands behind");
  refuses<bad_file>([] { file_of("a,b\n1,2\n").column("c"); }, "the column 'c' is missing; there are 'a', 'b'");
  refuses<bad_file>([] { file_of("a,a\n1,2\n").column("a"); }, "two columns are called 'a'");
  for (std::string const text : {"", "x", "1.5x", "nan", "inf", "-inf", "1e999", "0x10", "1 2", "--1", "+-1", "1;5"})
    refuses<bad_file>(
        [&] {
          auto const f = file_of("a,b\n1," + text + "\n");
          f.number(f.rows()[0], 1);
        },
        "line 2: '" + text + "' stands in column 'b', where a number is due");
}

void words() {
  holds(leak::with_error({}) == "0.000 +- 0.000", "no error");
  holds(leak::decimals_for(0.44) == 2 && leak::decimals_for(1.3) == 1 && leak::decimals_for(21.0) == 0 &&
            leak::decimals_for(0.0996) == 3,
        "two digits of an error");
  holds(leak::stretches({0, 1, 2, 4, 6, 7}) == "0 to 300 m, 400 to 500 m, 600 to 800 m", "stretches");
  holds(leak::wrapped("a b\nc\n") == "a b\nc\n", "lines stay");
  std::string const wide(96, 'x');
  holds(leak::wrapped(wide + " 1 +- 2 %, y") == wide + "\n1 +- 2 %, y\n", "no line ends inside a number");
  holds(leak::on_point("2.25 +- 0.44", 3, 16) == "  2.25 +- 0.44  ", "decimal points below each other");

  auto const asked = [](std::initializer_list<char const*> line) {
    std::vector<char const*> words{"leak"};
    words.insert(words.end(), line.begin(), line.end());
    return leak::options_from(static_cast<int>(words.size()), words.data());
  };
  auto const all =
      asked({"--readings", "r", "--states", "s", "--samples", "7", "--seed", "8", "--threads", "0", "--check"});
  holds(all.readings == "r" && all.states == "s" && all.samples == 7 && all.seed == 8 && all.threads == 0 && all.check,
        "options");
  holds(asked({"r"}).readings == "r" && asked({"--help"}).help, "a file alone, and help");
  using leak::bad_option;
  refuses<bad_option>([&] { asked({}); }, "a file of readings is needed");
  refuses<bad_option>([&] { asked({"a", "b"}); }, "two files of readings");
  refuses<bad_option>([&] { asked({"a", "--samples"}); }, "--samples needs a value");
  refuses<bad_option>([&] { asked({"a", "--sample", "3"}); }, "no option --sample");
  for (char const* text : {"0", "-1", "1e5", "x", "99999999999999999999"})
    refuses<bad_option>([&] { asked({"a", "--samples", text}); }, "--samples takes a whole number from 1 to");
}

}  // namespace

int main() {
  friction();
  orifice();
  steady();
  invented(LEAK_READINGS);
  reader();
  words();
  std::cout << checked << " checks, " << failed << " failed\n";
  return failed == 0 && checked > 0 ? 0 : 1;
}
