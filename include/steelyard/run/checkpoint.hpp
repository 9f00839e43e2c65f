// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <cstdint>
#include <span>
#include <string>
#include <string_view>
#include <vector>

#include <steelyard/base/chrono.hpp>
#include <steelyard/base/error.hpp>
#include <steelyard/base/function_ref.hpp>
#include <steelyard/run/bytes.hpp>
#include <steelyard/run/plan.hpp>
#include <steelyard/run/run_worker.hpp>

namespace steelyard::inline v1::detail {

/// One run's dealings with its checkpoint: a head that says which run it is,
/// the run's own bytes, and a fingerprint over all of it.
///   Written at round ends, no more often than costs a twentieth of the time, and at the end.
class checkpoint_keeper {
 public:
  using clock = std::chrono::steady_clock;

  /// @param shape  tells one set of questions from another: columns, names of the readings
  checkpoint_keeper(plan const& how, std::uint32_t kind, std::string_view shape) : plan_(how), kind_(kind), shape_(shape) {}

  /// Calls load(reader, next block) with what was left, and returns the next block; 0 where nothing was.
  /// @throws bad_checkpoint for another version, kind, plan or length, or damaged bytes
  std::uint64_t take_up(run_shared& shared, function_ref<void(byte_reader&)> load) {
    if (!plan_.checkpoint) return 0;
    std::vector<std::byte> const bytes = plan_.checkpoint->read();
    if (bytes.empty()) return 0;
    if (bytes.size() < sizeof(std::uint64_t)) refuse("it ends too early; it was cut short or damaged");
    std::span<std::byte const> const body(bytes.data(), bytes.size() - sizeof(std::uint64_t));
    byte_reader tail(std::span<std::byte const>(bytes).last(sizeof(std::uint64_t)));
    byte_reader in(body);
    if (in.next<std::uint64_t>() != magic) refuse("these bytes are none of ours");
    expect(in.next<std::uint32_t>(), version, "format version");
    if (tail.next<std::uint64_t>() != fingerprint(body)) refuse("its fingerprint does not match; it was cut short or damaged");
    expect(in.next<std::uint32_t>(), kind_, "kind of run");
    expect(in.next<std::uint64_t>(), plan_.seed, "seed");
    expect(in.next<std::uint64_t>(), plan_.size, "size");
    expect(in.next<std::uint32_t>(), static_cast<std::uint32_t>(plan_.on_failure), "treatment of failures");
    expect(in.next<std::uint32_t>(), plan_.source.independent() ? 1u : 0u, "source of words");
    std::vector<char> shape;
    in.get(shape);
    if (std::string_view(shape.data(), shape.size()) != shape_)
      refuse("it belongs to other questions or readings than these");
    std::uint64_t const next = in.next<std::uint64_t>();
    in.get(shared.failed);
    in.get(shared.largest);
    in.get(shared.probes);
    load(in);
    if (in.left() != 0) refuse("it is longer than this run's; it belongs to another program");
    return next;
  }

  /// Leaves a checkpoint after block `next` - 1: `store(writer)` adds the run's own bytes.
  void leave(std::uint64_t next, bool over, run_shared const& shared, function_ref<void(byte_writer&)> store) {
    if (!plan_.checkpoint) return;
    auto const start = clock::now();
    if (!over && start - last_ < 20 * cost_) return;
    byte_writer out;
    out.put(magic);
    out.put(version);
    out.put(kind_);
    out.put(plan_.seed.value());
    out.put(plan_.size.value());
    out.put(static_cast<std::uint32_t>(plan_.on_failure));
    out.put(plan_.source.independent() ? std::uint32_t{1} : std::uint32_t{0});
    out.put(std::vector<char>(shape_.begin(), shape_.end()));
    out.put(next);
    out.put(shared.failed);
    out.put(shared.largest);
    out.put(shared.probes);
    store(out);
    out.put(fingerprint(out.bytes()));
    plan_.checkpoint->write(out.bytes());
    last_ = clock::now();
    cost_ = last_ - start;
  }

 private:
  static constexpr std::uint64_t magic = 0x6472617965656c73u;
  static constexpr std::uint32_t version = 1;

  [[noreturn]] static void refuse(std::string const& why) { throw bad_checkpoint("checkpoint: " + why); }
  static void expect(std::uint64_t found, std::uint64_t wanted, char const* what) {
    if (found != wanted)
      refuse("its " + std::string(what) + " is " + std::to_string(found) + " and this run's is " + std::to_string(wanted) +
             "; take it up with the plan that left it");
  }

  plan const& plan_;
  std::uint32_t kind_;
  std::string shape_;
  clock::time_point last_{};
  clock::duration cost_{};
};

}  // namespace steelyard::inline v1::detail
