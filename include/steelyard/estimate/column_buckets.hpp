// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <atomic>
#include <bit>
#include <cstddef>
#include <cstdint>
#include <memory>
#include <mutex>
#include <utility>
#include <vector>

#include <steelyard/base/algorithm.hpp>
#include <steelyard/estimate/share_sums.hpp>

namespace steelyard::inline v1::detail {

/// Entries in rising order of their values, as far as anybody looks: they are parted by value into up to 256 buckets at
/// once, and a bucket is sorted when it is first looked into. `Entry` has value, weight and copies(); where it says
/// `keeps_order`, buckets are sorted apart, and `for_each` goes over all entries in an order that no look changes.
///   parted as in sample sort: splitters at even places of a sorted part of the values     [Frazer & McKellar, J. ACM 17, 1970]
/// Looking is safe from several threads, and what is seen does not depend on who looked where before.
/// Cost  about 10 ns an entry, and the sort of the buckets that are looked into.
template <class Entry>
class column_buckets {
 public:
  /// @param entry_of  entry_of(i) for i = 0 .. n - 1, called twice each
  template <class EntryOf>
  column_buckets(std::size_t n, EntryOf entry_of) : entries_(n) {
    int const levels = n < 8192 ? 0 : std::min(8, static_cast<int>(std::bit_width(n / 4096)) - 1);
    std::size_t const buckets = std::size_t{1} << levels;
    double tree[most] = {};
    plant(n, levels, entry_of, tree);
    std::vector<std::uint8_t> which(n);
    std::size_t sizes[most] = {};
    for (std::size_t i = 0; i < n; ++i) {
      double const x = entry_of(i).value;
      std::size_t node = 1;
      for (int level = 0; level < levels; ++level) node = 2 * node + (x >= tree[node] ? 1 : 0);
      which[i] = static_cast<std::uint8_t>(node - buckets);
      ++sizes[node - buckets];
    }
    starts_.assign(buckets + 1, 0);
    for (std::size_t b = 0; b < buckets; ++b) starts_[b + 1] = starts_[b] + sizes[b];
    std::size_t next[most];
    std::copy_n(starts_.begin(), buckets, next);
    std::vector<cell_sums> sums(buckets);
    for (std::size_t i = 0; i < n; ++i) {
      Entry const entry = entry_of(i);
      entries_[next[which[i]]++] = entry;
      sums[which[i]].add(entry.copies(), entry.weight);
    }
    before_.resize(buckets + 1);
    after_.resize(buckets + 1);
    for (std::size_t b = 0; b < buckets; ++b) (before_[b + 1] = before_[b]) += sums[b];
    for (std::size_t b = buckets; b-- > 0;) (after_[b] = after_[b + 1]) += sums[b];
    sorted_ = std::make_unique<looked_into[]>(buckets);
  }

  [[nodiscard]] std::size_t size() const noexcept { return entries_.size(); }
  [[nodiscard]] cell_sums const& all() const noexcept { return before_.back(); }
  [[nodiscard]] Entry const& operator[](std::size_t i) const {
    std::size_t const b = bucket_of(i);
    return look_into(b).entries[i - starts_[b]];
  }

  /// The first entry with which the running weight reaches `wanted`; the last one if none does.
  [[nodiscard]] std::size_t reaching(double wanted) const {
    auto const at = std::partition_point(before_.begin() + 1, before_.end() - 1,
                                         [&](cell_sums const& each) { return each.weight < wanted; });
    std::size_t b = static_cast<std::size_t>(at - before_.begin()) - 1;
    while (b > 0 && starts_[b] == starts_[b + 1]) --b;
    looked_into const& bucket = look_into(b);
    std::vector<cell_sums> const& marks = bucket.marks;
    Entry const* const entries = bucket.entries;
    auto const mark = std::partition_point(marks.begin() + 1, marks.end(),
                                           [&](cell_sums const& each) { return each.weight < wanted; });
    std::size_t const m = static_cast<std::size_t>(mark - marks.begin()) - 1;
    double sum = marks[m].weight;
    std::size_t i = m * stride;
    for (; i + 1 < starts_[b + 1] - starts_[b]; ++i)
      if ((sum += entries[i].copies() * entries[i].weight) >= wanted) break;
    return starts_[b] + i;
  }
  /// How many entries are at most, or are less than, the one at this place: equal ones share a bucket.
  [[nodiscard]] std::size_t up_to(std::size_t i) const { return bound(i, true); }
  [[nodiscard]] std::size_t before(std::size_t i) const { return bound(i, false); }

  /// Sums over the first n entries, and over all the others: neither is a difference.
  [[nodiscard]] cell_sums first(std::size_t n) const {
    if (n == size()) return all();
    std::size_t const b = bucket_of(n), from = n - starts_[b];
    if (from == 0) return before_[b];
    looked_into const& bucket = look_into(b);
    cell_sums sums = bucket.marks[from / stride];
    for (std::size_t i = from / stride * stride; i < from; ++i) sums.add(bucket.entries[i].copies(), bucket.entries[i].weight);
    return sums;
  }
  [[nodiscard]] cell_sums rest(std::size_t n) const {
    if (n == size()) return {};
    std::size_t const b = bucket_of(n);
    if (n == starts_[b]) return after_[b];
    Entry const* const entries = look_into(b).entries;
    cell_sums sums;
    for (std::size_t i = n - starts_[b]; i < starts_[b + 1] - starts_[b]; ++i) sums.add(entries[i].copies(), entries[i].weight);
    return sums += after_[b + 1];
  }
  /// act(entry, whether it is among the first n), in an order that depends on n alone.
  template <class Act>
  void for_each(std::size_t n, Act act) const {
    static_assert(keeps_order);
    std::size_t const b = n < size() ? bucket_of(n) : starts_.size() - 1;
    for (std::size_t i = 0; i < starts_[b]; ++i) act(entries_[i], true);
    if (n == size()) return;
    Entry const* const entries = look_into(b).entries;
    for (std::size_t i = starts_[b]; i < starts_[b + 1]; ++i) act(entries[i - starts_[b]], i < n);
    for (std::size_t i = starts_[b + 1]; i < size(); ++i) act(entries_[i], false);
  }

 private:
  static constexpr std::size_t most = 256;
  static constexpr std::size_t stride = 256;
  static constexpr bool keeps_order = requires { Entry::keeps_order; };
  struct looked_into {
    std::atomic<bool> done{false};
    Entry const* entries = nullptr;  // in rising order
    std::vector<cell_sums> marks;    // running sums at every `stride`-th entry
    std::vector<Entry> apart;        // the entries, where the column keeps its order
  };

  /// Splitters as a search tree: node k has children 2 k and 2 k + 1, larger values on the right.
  template <class EntryOf>
  static void plant(std::size_t n, int levels, EntryOf entry_of, double (&tree)[most]) {
    if (levels == 0) return;
    constexpr std::size_t each = 16;
    std::size_t const buckets = std::size_t{1} << levels, some = each * buckets;
    std::vector<double> part(some);
    for (std::size_t k = 0; k < some; ++k) part[k] = entry_of(k * (n / some) + k * (n % some) / some).value;
    std::sort(part.begin(), part.end());
    for (std::size_t node = 1; node < buckets; ++node) {
      int const depth = static_cast<int>(std::bit_width(node)) - 1;
      std::size_t const across = 2 * (node - (std::size_t{1} << depth)) + 1;  // in units of half a node's width
      tree[node] = part[each * (across << (levels - depth - 1))];
    }
  }

  [[nodiscard]] std::size_t bucket_of(std::size_t i) const noexcept {
    return static_cast<std::size_t>(std::upper_bound(starts_.begin(), starts_.end(), i) - starts_.begin()) - 1;
  }
  looked_into const& look_into(std::size_t b) const {
    looked_into& bucket = sorted_[b];
    if (bucket.done.load(std::memory_order_acquire)) return bucket;
    std::lock_guard const lock(mutex_);
    if (bucket.done.load(std::memory_order_relaxed)) return bucket;
    std::size_t const n = starts_[b + 1] - starts_[b];
    Entry* entries = entries_.data() + starts_[b];
    if constexpr (keeps_order) {
      bucket.apart.assign(entries, entries + n);
      entries = bucket.apart.data();
    }
    std::sort(entries, entries + n, [](Entry const& x, Entry const& y) { return x.value < y.value; });
    cell_sums running = before_[b];
    std::vector<cell_sums> marks{running};
    for (std::size_t i = 0; i < n; ++i) {
      if (i > 0 && i % stride == 0) marks.push_back(running);
      running.add(entries[i].copies(), entries[i].weight);
    }
    bucket.marks = std::move(marks);
    bucket.entries = entries;
    bucket.done.store(true, std::memory_order_release);
    return bucket;
  }
  [[nodiscard]] std::size_t bound(std::size_t i, bool past) const {
    std::size_t const b = bucket_of(i);
    Entry const* const from = look_into(b).entries;
    Entry const* const to = from + (starts_[b + 1] - starts_[b]);
    double const x = from[i - starts_[b]].value;
    Entry const* const end = std::partition_point(from, to, [&](Entry const& e) { return past ? e.value <= x : e.value < x; });
    return starts_[b] + static_cast<std::size_t>(end - from);
  }

  std::vector<Entry> mutable entries_;           // by bucket
  std::vector<std::size_t> starts_;              // of each bucket, and the end
  std::vector<cell_sums> before_, after_;        // sums of the buckets below each, and of each and those above
  std::unique_ptr<looked_into[]> sorted_;
  std::mutex mutable mutex_;
};

}  // namespace steelyard::inline v1::detail
