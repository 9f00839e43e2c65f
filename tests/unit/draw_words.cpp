// SPDX-License-Identifier: BSL-1.0
#include <doctest/doctest.h>

#include <steelyard/draw/draws.hpp>
#include <steelyard/draw/words.hpp>

#include <bit>
#include <cstdint>
#include <memory>
#include <span>
#include <string>
#include <vector>

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

TEST_CASE("many words at once are those had one at a time, from any place on, and leave the stream where they would") {
  for (std::size_t const before : {0u, 1u, 3u, 4u, 5u, 31u, 60u})
    for (std::size_t const n : {0u, 1u, 3u, 4u, 5u, 29u, 32u, 33u, 1'000u}) {
      sy::draws one(3, 5, sy::purpose::resample, 2), many(3, 5, sy::purpose::resample, 2);
      for (std::size_t k = 0; k < before; ++k) CHECK(one() == many());
      std::vector<std::uint64_t> words(n + 1, 99);
      sy::detail::draws_access::fill(many, std::span<std::uint64_t>(words).first(n));
      std::size_t differ = 0;
      for (std::size_t k = 0; k < n; ++k) differ += words[k] == one() ? 0u : 1u;
      CHECK(differ == 0);
      CHECK(words[n] == 99);
      CHECK(many.words_used() == before + n);
      CHECK(many.normal() == one.normal());
      for (int k = 0; k < 100; ++k) differ += many() == one() ? 0u : 1u;
      CHECK(differ == 0);
    }
}

TEST_CASE("many words at once of words made before, of a record and of a custom source") {
  std::vector<std::uint64_t> const first{11, 12, 13, 14, 15, 16, 17, 18};
  sy::draws one(1), many(1);
  sy::detail::draws_access::seat(one, 4, 2, sy::purpose::run, 0, first);
  sy::detail::draws_access::seat(many, 4, 2, sy::purpose::run, 0, first);
  std::vector<std::uint64_t> words(70), wanted(70);
  auto const both = [&] {
    for (std::uint64_t& each : wanted) each = one();
    sy::detail::draws_access::fill(many, words);
    CHECK(words == wanted);
    CHECK(one.words_used() == many.words_used());
    CHECK(one() == many());
  };
  both();

  std::vector<std::uint64_t> record_one{21, 22, 23}, record_many{21, 22, 23};
  sy::detail::draws_access::record(one, record_one, 4, 2, sy::purpose::move);
  sy::detail::draws_access::record(many, record_many, 4, 2, sy::purpose::move);
  both();
  CHECK(record_one == record_many);

  replicated const source;
  sy::detail::draws_access::seat(one, source, 1, 17);
  sy::detail::draws_access::seat(many, source, 1, 17);
  both();
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
