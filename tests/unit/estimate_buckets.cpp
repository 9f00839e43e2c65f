// SPDX-License-Identifier: BSL-1.0
#include <doctest/doctest.h>

#include <steelyard/estimate/bins.hpp>
#include <steelyard/estimate/column_buckets.hpp>
#include <steelyard/estimate/histogram.hpp>
#include <steelyard/estimate/quantile.hpp>
#include <steelyard/estimate/splitters.hpp>

#include <algorithm>
#include <bit>
#include <cmath>
#include <cstddef>
#include <cstdint>
#include <cstring>
#include <limits>
#include <memory>
#include <span>
#include <string>
#include <thread>
#include <utility>
#include <vector>

#include "unit/law_support.hpp"

namespace sy = steelyard;
using sy::detail::cell_sums;
using sy::detail::column_buckets;
using sy::detail::column_parts;
using sy::detail::counted_entry;
using sy::detail::plain_entry;

namespace {

/// Whole numbers in an order that looks like none.
struct hashed {
  std::uint64_t state = 1;
  std::uint64_t operator()() {
    std::uint64_t z = state += 0x9e3779b97f4a7c15u;
    z = (z ^ (z >> 30)) * 0xbf58476d1ce4e5b9u;
    z = (z ^ (z >> 27)) * 0x94d049bb133111ebu;
    return z ^ (z >> 31);
  }
};

enum class shape { any, rising, falling, organ_pipe, equal, two_values, ties, in_step, outlier, zeros };
constexpr shape shapes[] = {shape::any,        shape::rising, shape::falling, shape::organ_pipe, shape::equal,
                            shape::two_values, shape::ties,   shape::in_step, shape::outlier,    shape::zeros};

std::vector<double> values_of(shape of, std::size_t n) {
  hashed next{n};
  std::vector<double> all(n);
  for (std::size_t i = 0; i < n; ++i) {
    double const x = static_cast<double>(i), u = static_cast<double>(next() >> 11) * 0x1p-53;
    switch (of) {
      case shape::any: all[i] = u - 0.5; break;
      case shape::rising: all[i] = x; break;
      case shape::falling: all[i] = -x; break;
      case shape::organ_pipe: all[i] = std::min(x, static_cast<double>(n - 1 - i)); break;
      case shape::equal: all[i] = 4.25; break;
      case shape::two_values: all[i] = u < 0.9 ? 1.0 : 2.0; break;
      case shape::ties: all[i] = std::floor(40.0 * u * u); break;
      case shape::in_step: all[i] = i % 8 == 0 ? 0.0 : 1.0 + u; break;  // where splitters are looked for, one value alone
      case shape::outlier: all[i] = i == n / 2 ? 1e300 : 1e-300 * u; break;
      case shape::zeros: all[i] = u < 0.5 ? -0.0 : 0.0; break;
    }
  }
  return all;
}

/// Weights of few binary digits, so that sums are exact in any order.
std::vector<counted_entry> entries_of(shape of, std::size_t n, std::uint64_t most_copies) {
  hashed next{n + 7};
  std::vector<counted_entry> all;
  for (double const x : values_of(of, n)) {
    std::uint64_t const word = next();
    all.push_back({x, static_cast<double>(word % 16 + 1) / 16.0, static_cast<double>(word / 64 % most_copies + 1),
                   static_cast<std::uint32_t>(word >> 40) % 50u});
  }
  return all;
}

/// The entries in parts of uneven lengths, whose factors, powers of two, give the weights back.
column_parts parts_of(std::vector<counted_entry> const& entries, bool counted) {
  hashed next{3};
  column_parts all;
  for (std::size_t from = 0; from < entries.size();) {
    std::size_t const n = std::min(entries.size() - from, static_cast<std::size_t>(next() % 1500));
    double const factor = next() % 2 == 0 ? 1.0 : 0.25;
    std::vector<double> values, weights;
    std::vector<std::uint64_t> counts;
    std::vector<std::uint32_t> groups;
    for (std::size_t i = from; i < from + n; ++i) {
      values.push_back(entries[i].value);
      weights.push_back(entries[i].weight / factor);
      counts.push_back(static_cast<std::uint64_t>(entries[i].count));
      groups.push_back(entries[i].group);
    }
    sy::weighted_view view;
    view.values = values;
    view.weights = weights;
    if (counted) {
      view.counts = counts;
      view.groups = groups;
    }
    column_parts part;
    part.take(view);
    part.rescale(factor);
    all += part;
    from += n;
  }
  return all;
}

bool same(cell_sums const& a, cell_sums const& b) { return a.weight == b.weight && a.second == b.second && a.fourth == b.fourth; }

/// Everything that can be asked of a column, beside a plain sort. Returns what differed, or nothing.
template <class Entry>
std::string differs(column_buckets<Entry> const& column, std::vector<counted_entry> sorted) {
  std::stable_sort(sorted.begin(), sorted.end(), [](auto const& a, auto const& b) { return a.value < b.value; });
  std::size_t const n = sorted.size();
  if (column.size() != n) return "size";
  cell_sums all;
  for (counted_entry const& each : sorted) all.add(each.count, each.weight);
  if (!same(column.all(), all)) return "all";
  hashed next;
  for (std::size_t look = 0; look < 40; ++look) {
    std::size_t const i = look == 0 ? 0 : look == 1 ? n - 1 : static_cast<std::size_t>(next() % n);
    auto const by_value = [](counted_entry const& a, counted_entry const& b) { return a.value < b.value; };
    auto const place = [&](auto at) { return static_cast<std::size_t>(at - sorted.begin()); };
    std::size_t const low = place(std::lower_bound(sorted.begin(), sorted.end(), sorted[i], by_value));
    std::size_t const high = place(std::upper_bound(sorted.begin(), sorted.end(), sorted[i], by_value));
    std::string const where = " at " + std::to_string(i);
    if (column[i].value != sorted[i].value) return "value" + where;
    if (column.before(i) != low || column.up_to(i) != high) return "equal ones" + where;
    for (std::size_t const cut : {low, high}) {
      cell_sums in, out;
      for (std::size_t k = 0; k < n; ++k) (k < cut ? in : out).add(sorted[k].count, sorted[k].weight);
      if (!same(column.first(cut), in)) return "first" + where;
      if (!same(column.rest(cut), out)) return "rest" + where;
      if (cut == high) {  // the weight up to here is reached by one of the equal ones, and by no smaller value
        std::size_t const at = column.reaching(in.weight), after = column.reaching(in.weight + 0.03125);
        if (column[at].value != sorted[i].value) return "reaching" + where;
        if (high < n && column[after].value != sorted[high].value) return "reaching a little more" + where;
        if (high == n && after != n - 1) return "reaching more than there is" + where;
      }
    }
    if constexpr (requires { Entry::stays; }) {
      double in = 0.0, in_group = 0.0, seen = 0.0;
      column.for_each(i, [&](Entry const& each, bool within) {
        seen += each.count * each.weight;
        if (within) in += 1.0;
        if (within != (each.value < sorted[i].value) && each.value != sorted[i].value) in = -1e9;
        if (each.group == 3) in_group += each.weight;
      });
      double want = 0.0;
      for (counted_entry const& each : sorted)
        if (each.group == 3) want += each.weight;
      if (in != static_cast<double>(i) || seen != all.weight || in_group != want) return "each" + where;
    }
  }
  return {};
}

}  // namespace

namespace {

double step(double x, int by) {
  double const far = by > 0 ? std::numeric_limits<double>::max() : std::numeric_limits<double>::lowest();
  for (int k = 0; k < std::abs(by); ++k) x = std::nextafter(x, far);
  return x;
}

/// Sets of splitters for every way to find a bucket: none, few to a slot, too many to a slot, slots that cannot be had.
std::vector<std::vector<double>> sets_of_splitters() {
  double const most = std::numeric_limits<double>::max(), least = std::numeric_limits<double>::denorm_min();
  double infinite;
  std::uint64_t const bits = 0x7ff0000000000000u;
  std::memcpy(&infinite, &bits, sizeof bits);
  std::vector<std::vector<double>> sets = {{},
                                           {2.5},
                                           {0.0, 0.0, 0.0},
                                           {-0.0, 0.0, 1.0},
                                           {0.0, least, 2.0 * least, 3.0 * least},
                                           {-most, most},
                                           {-most, 0.0},
                                           {-infinite, -1.0, 1.0, infinite},
                                           {1e300, 1.5e300, most},
                                           {-1e-300, 1e-300, 1e300},
                                           {1.0, step(1.0, 1), step(1.0, 2), step(1.0, 3), step(1.0, 4), 2.0}};
  for (double const power : {1.0, 2.0, 3.0, 20.0}) {  // ever closer together at their lower end
    std::vector<double> set;
    for (int k = 0; k < 255; ++k) set.push_back(std::pow((k + 1) / 255.0, power));
    sets.push_back(set);
    for (double& each : set) each = 1e6 + 1e-9 * each;
    sets.push_back(set);
  }
  return sets;
}

}  // namespace

TEST_CASE("the bucket of a number is how many splitters lie at or below it, whatever way it is found") {
  for (std::vector<double> const& set : sets_of_splitters()) {
    sy::detail::splitters const found(set);
    std::vector<double> distinct = set, values = {0.0, -0.0, 1e-300, -1e300, std::numeric_limits<double>::denorm_min()};
    distinct.erase(std::unique(distinct.begin(), distinct.end()), distinct.end());
    CHECK(found.buckets() == distinct.size() + 1);
    hashed next;
    for (double const each : set)
      for (int by = -3; by <= 3; ++by) values.push_back(step(each, by));
    for (std::size_t k = 0; k < 1000 && !set.empty(); ++k) {
      double const u = static_cast<double>(next() >> 11) * 0x1p-53;
      values.push_back(set.front() * (1.0 - u) + set.back() * u);
    }
    for (double const each : {std::numeric_limits<double>::max(), std::numeric_limits<double>::lowest()}) values.push_back(each);
    std::vector<std::uint8_t> buckets(values.size());
    found.place(values.data(), values.size(), buckets.data());
    std::size_t wrong = 0;
    for (std::size_t i = 0; i < values.size(); ++i) {
      std::size_t want = 0;
      for (double const each : distinct) want += values[i] >= each ? 1u : 0u;
      wrong += buckets[i] == want ? 0u : 1u;
    }
    CAPTURE(set.size());
    CHECK(wrong == 0);
  }
}

TEST_CASE("a column in buckets answers as a sorted one, whatever its length and the shape of its values") {
  for (std::size_t const n : {1u, 2u, 255u, 256u, 257u, 511u, 512u, 513u, 1024u, 4096u, 8193u, 20'000u, 70'000u})
    for (shape const of : shapes) {
      if (n > 20'000 && of != shape::any && of != shape::ties && of != shape::in_step) continue;
      CAPTURE(n);
      CAPTURE(static_cast<int>(of));
      std::vector<counted_entry> const one_each = entries_of(of, n, 1);
      column_buckets<plain_entry> const plain(parts_of(one_each, false));
      CHECK(differs(plain, one_each) == "");
      std::vector<counted_entry> const several = entries_of(of, n, 5);
      column_buckets<counted_entry> const counted(parts_of(several, true));
      CHECK(differs(counted, several) == "");
      for (bool const before : {false, true}) {
        column_buckets<plain_entry> const all_at_once(parts_of(one_each, false));
        if (before) static_cast<void>(all_at_once[n / 3]);
        all_at_once.look_into_all();
        CHECK(differs(all_at_once, one_each) == "");
        all_at_once.look_into_all();
        CHECK(differs(all_at_once, one_each) == "");
      }
    }
}

namespace {

/// A value that counts its comparisons with others of its kind.
struct watched {
  double x = 0.0;
  watched() = default;
  explicit watched(double its_x) : x(its_x) {}
  operator double() const { return x; }
  static inline std::size_t comparisons = 0;
  friend bool operator<(watched const& a, watched const& b) {
    ++comparisons;
    return a.x < b.x;
  }
};
struct watched_entry {
  watched value;
  double weight = 0.0;
  static watched_entry of(column_parts::part const& part, std::size_t i) { return {watched(part.values[i]), part.weight(i)}; }
  static constexpr double copies() noexcept { return 1.0; }
};

}  // namespace

TEST_CASE("no shape of values makes a look into every bucket cost more than a sort") {
  std::size_t const n = 100'000;
  for (shape const of : shapes) {
    watched::comparisons = 0;
    column_buckets<watched_entry> const column(parts_of(entries_of(of, n, 1), false));
    CHECK(watched::comparisons == 0);
    for (std::size_t i = 0; i < n; i += 16) static_cast<void>(column[i]);
    CAPTURE(static_cast<int>(of));
    // Heap sort, the worst that an introspective sort falls back to, takes less than 2 n log2 n after 2 log2 n rounds of
    // parting, each of which takes about n.
    CHECK(static_cast<double>(watched::comparisons) < 4.0 * static_cast<double>(n) * std::log2(static_cast<double>(n)));
  }
}

namespace {

struct grouped_data {
  std::vector<double> values, weights;
  std::vector<std::uint64_t> counts;
  std::vector<std::uint32_t> groups;
  explicit grouped_data(std::size_t n) {
    hashed next;
    for (std::size_t i = 0; i < n; ++i) {
      values.push_back(static_cast<double>(next() % 5000) / 7.0);
      weights.push_back(static_cast<double>(next() >> 11) * 0x1p-53);
      counts.push_back(next() % 3 + 1);
      groups.push_back(static_cast<std::uint32_t>(next() % 40));
    }
  }
  [[nodiscard]] std::shared_ptr<sy::detail::weighted_column const> column(bool grouped) const {
    sy::weighted_view view;
    view.values = values;
    view.weights = weights;
    sy::run_facts facts;
    facts.drawn = values.size();
    facts.sum_squares = 1.0;
    facts.sum = 100.0;
    if (grouped) {
      view.counts = counts;
      view.groups = groups;
      view.how = facts.how = sy::how_drawn::lineages;
      facts.groups = 40.0;
      facts.group_share_squares = 1.0 / 40.0;
    }
    column_parts parts;
    parts.take(view);
    return std::make_shared<sy::detail::weighted_column const>(std::move(parts), facts);
  }
};

law::all_bits bits_at(std::shared_ptr<sy::detail::weighted_column const> const& column, int level) {
  law::all_bits bits;
  law::put(bits, sy::quantile_result(column, static_cast<double>(level) / 31.0));
  return bits;
}

}  // namespace

TEST_CASE("what a column answers does not depend on what it was asked before, nor on the threads that ask") {
  grouped_data const data(30'000);
  for (bool const grouped : {false, true}) {
    CAPTURE(grouped);
    std::vector<law::all_bits> alone(31), falling(31), at_once(31);
    for (int level = 1; level < 31; ++level) alone[static_cast<std::size_t>(level)] = bits_at(data.column(grouped), level);
    auto const asked_before = data.column(grouped);
    for (int level = 30; level > 0; --level) falling[static_cast<std::size_t>(level)] = bits_at(asked_before, level);
    CHECK(falling == alone);
    auto const shared = data.column(grouped);
    std::vector<std::thread> threads;
    for (int t = 0; t < 3; ++t)
      threads.emplace_back([&, t] {
        for (int k = 0; k < 10; ++k) {
          int const level = 1 + (k * 3 + t) % 30;
          at_once[static_cast<std::size_t>(level)] = bits_at(shared, level);
        }
      });
    for (std::thread& each : threads) each.join();
    CHECK(at_once == alone);
  }
}

TEST_CASE("an answer does not change when its estimator goes on, is merged or read back") {
  grouped_data const data(3000);
  sy::weighted_view first, second;
  first.values = std::span<double const>(data.values).first(2000);
  first.weights = std::span<double const>(data.weights).first(2000);
  second.values = std::span<double const>(data.values).subspan(2000);
  second.weights = std::span<double const>(data.weights).subspan(2000);
  sy::run_facts facts;
  facts.drawn = 3000;
  facts.sum_squares = 1.0;
  facts.sum = 100.0;
  auto const itself = [](double x) { return x; };
  auto const bits = [](sy::quantile_result const& r, double level) {
    law::all_bits all;
    law::put(all, r);
    sy::interval const limits = r.error_interval(level);
    for (double const each : {limits.lower, limits.upper}) all.push_back(std::bit_cast<std::uint64_t>(each));
    return all;
  };
  auto sums = sy::quantile(itself, 0.3), later = sy::quantile(itself, 0.3), whole = sy::quantile(itself, 0.3);
  sums.add(first.values, first.weights, first);
  later.add(second.values, second.weights, second);
  whole.add(first.values, first.weights, first);
  auto const copy = sums;
  sy::quantile_result const early = sums.answer(facts);
  auto const then = bits(copy.answer(facts), 0.5);
  sums += later;
  sums.rescale(0.5);
  whole += later;
  whole.rescale(0.5);
  CHECK(bits(sums.answer(facts), 0.9) == bits(whole.answer(facts), 0.9));
  CHECK(bits(sums.answer(facts), 0.5) != then);
  CHECK(bits(early, 0.5) == then);  // a level that was not looked at before
  CHECK(bits(copy.answer(facts), 0.5) == then);
  auto const moved = std::move(sums);
  CHECK(bits(moved.answer(facts), 0.9) == bits(whole.answer(facts), 0.9));
}

namespace {

/// Values on, beside and between the edges, far out, infinite and no number.
std::vector<double> hard_values(sy::bins const& edges) {
  double const lowest = std::numeric_limits<double>::lowest();
  std::vector<double> all = {0.0, -0.0, lowest, -lowest, std::numeric_limits<double>::denorm_min()};
  for (std::size_t e = 0; e <= edges.size(); ++e) {
    double x = edges.edge(e);
    for (int k = 0; k < 3; ++k) x = std::nextafter(x, lowest);
    for (int k = 0; k < 7; ++k, x = std::nextafter(x, -lowest)) all.push_back(x);
  }
  hashed next;
  double const span = edges.edge(edges.size()) - edges.edge(0);
  for (int k = 0; k < 2000; ++k) all.push_back(edges.edge(0) + span * (static_cast<double>(next() >> 11) * 0x1p-52 - 0.5));
  for (std::uint64_t const bits : {0x7ff0000000000000u, 0xfff0000000000000u, 0x7ff8000000000000u, 0xfff8000000000001u}) {
    double x;
    std::memcpy(&x, &bits, sizeof bits);
    all.push_back(x);
  }
  return all;
}

/// By the edges alone.
std::size_t cell_by_edges(sy::bins const& edges, double x) {
  std::size_t const n = edges.size();
  std::uint64_t bits;
  std::memcpy(&bits, &x, sizeof bits);
  if ((bits & 0x7fffffffffffffffu) > 0x7ff0000000000000u) return n + 2;
  if (x < edges.edge(0)) return n;
  if (x > edges.edge(n)) return n + 1;
  std::size_t b = 0;
  while (b + 1 < n && x >= edges.edge(b + 1)) ++b;
  return b;
}

std::vector<sy::bins> many_bins() {
  return {sy::equal_bins(0.0, 1.0, 100),    sy::equal_bins(-3.0, 5.0, 7),  sy::equal_bins(1e6, 1e6 + 1.0, 50),
          sy::equal_bins(-0.1, 0.2, 3),     sy::equal_bins(1e15, 1e15 + 64.0, 8),
          sy::equal_bins(-1e300, 1e300, 9), sy::equal_bins(0.0, 1e-300, 11), sy::equal_bins(2.0, 3.0, 1),
          sy::log_bins(1e-3, 1e3, 12),      sy::bins({-1.0, 0.0, 0.25, 9.0})};
}

}  // namespace

TEST_CASE("the cells of many values are those that the edges say, one by one") {
  for (sy::bins const& edges : many_bins()) {
    std::vector<double> const values = hard_values(edges);
    std::vector<std::uint64_t> cells(values.size());
    edges.cells(values, cells.data());
    std::size_t many = 0, one = 0;
    for (std::size_t i = 0; i < values.size(); ++i) {
      std::size_t const want = cell_by_edges(edges, values[i]);
      many += cells[i] == want ? 0u : 1u;
      one += edges.cell(values[i]) == want ? 0u : 1u;
    }
    CAPTURE(edges.edge(0));
    CAPTURE(edges.size());
    CHECK(many == 0);
    CHECK(one == 0);
  }
}

TEST_CASE("a histogram of a whole block is the one of its entries, one by one, with counts and without") {
  auto const itself = [](double x) { return x; };
  for (sy::bins const& edges : many_bins()) {
    std::vector<double> const values = hard_values(edges);
    std::size_t const n = values.size();
    std::vector<double> weights(n);
    std::vector<std::uint64_t> const ones(n, 1);
    hashed next;
    for (double& each : weights) each = static_cast<double>(next() % 16 + 1) / 16.0;
    auto whole = sy::histogram(itself, edges), counted = sy::histogram(itself, edges), singly = sy::histogram(itself, edges);
    sy::weighted_view view;
    view.values = values;
    view.weights = weights;
    whole.add(view.values, view.weights, view);
    view.counts = ones;
    counted.add(view.values, view.weights, view);
    view.counts = {};
    for (std::size_t i = 0; i < n; ++i) {
      view.values = std::span<double const>(values).subspan(i, 1);
      view.weights = std::span<double const>(weights).subspan(i, 1);
      singly.add(view.values, view.weights, view);
    }
    sy::run_facts facts;
    facts.drawn = n;
    auto const a = whole.answer(facts), b = counted.answer(facts), c = singly.answer(facts);
    std::vector<cell_sums> want(edges.size() + 3);
    double total = 0.0;
    for (std::size_t i = 0; i < n; ++i) {
      want[cell_by_edges(edges, values[i])].add(1.0, weights[i]);
      total += weights[i];
    }
    bool same_bins = true;
    for (std::size_t k = 0; k < edges.size(); ++k)
      for (auto const* other : {&b, &c})
        same_bins = same_bins && a.probability(k).value == other->probability(k).value &&
                    a.probability(k).standard_error == other->probability(k).standard_error &&
                    std::abs(a.probability(k).value - want[k].weight / total) <= 0x1p-51;  // a quotient may be rounded twice
    CAPTURE(edges.edge(0));
    CHECK(same_bins);
  }
}
