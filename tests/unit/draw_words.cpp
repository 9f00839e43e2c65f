// SPDX-License-Identifier: BSL-1.0
#include <doctest/doctest.h>

#include <steelyard/draw/draws.hpp>
#include <steelyard/draw/words.hpp>

#include <bit>
#include <cstdint>
#include <memory>
#include <span>
#include <string>

namespace sy = steelyard;

namespace {

// Eight replicates of a power of two samples each.
class replicated final : public sy::word_source {
 public:
  void fill(std::uint64_t, std::uint64_t sample, std::uint64_t, std::span<std::uint64_t> out) const override {
    for (auto& word : out) word = sample;
  }
  std::uint64_t replicates() const override { return 8; }
  std::uint64_t replicate_of(std::uint64_t sample) const override { return sample % 8; }
  bool allows(std::uint64_t size) const override { return size % 8 == 0 && std::has_single_bit(size / 8); }
  std::string sizes() const override { return "8 times a power of two"; }
};

}  // namespace

TEST_CASE("words are independent streams unless given a source") {
  sy::words const plain;
  CHECK(plain.independent());
  CHECK(plain.replicates() == 0);
  CHECK(plain.replicate_of(17) == 0);
  CHECK(plain.allows(1));
  CHECK(plain.allows(10'007));
  CHECK(plain.sizes() == "any size");
  CHECK(plain.source() == nullptr);
  sy::words const null = std::shared_ptr<sy::word_source const>();
  CHECK(null.independent());
}

TEST_CASE("a source names its replicates and the sizes it allows") {
  auto const source = std::make_shared<replicated>();
  sy::words const words = source;
  sy::words const copy = words;
  CHECK(!copy.independent());
  CHECK(copy.source() == source.get());
  CHECK(copy.replicates() == 8);
  CHECK(copy.replicate_of(17) == 1);
  CHECK(copy.allows(64));
  CHECK(!copy.allows(65));
  CHECK(!copy.allows(24));
  CHECK(copy.sizes() == "8 times a power of two");

  sy::draws d(1);
  sy::detail::draws_access::seat(d, *copy.source(), 1, 17);
  CHECK(d() == 17);
}

TEST_CASE("words may be a field of an aggregate") {
  struct settings {
    int size = 3;
    sy::words source = {};
  };
  settings const unset{.size = 4};
  settings const set{.source = std::make_shared<replicated const>()};
  CHECK(unset.source.independent());
  CHECK(set.source.replicates() == 8);
}
