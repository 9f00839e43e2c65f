// SPDX-License-Identifier: BSL-1.0
#include <gtest/gtest.h>

#include <steelyard/proof.hpp>

#include "../hive.hpp"

namespace sy = steelyard;
namespace proof = steelyard::proof;

TEST(Hive, IsCalibrated) {
  proof::check const c = proof::calibration(
      hive::sampler, hive::weigh_hive, [](double y) { return hive::weighter(y); }, &hive::state::honey);
  EXPECT_TRUE(c) << c;
}

TEST(Hive, WrongBalanceIsFound) {
  EXPECT_FALSE(proof::calibration(
      hive::sampler, hive::weigh_hive, [](double y) { return hive::weighter(y, 0.8); }, &hive::state::honey));
}

TEST(Hive, OwnEstimatorKeepsTheLaws) {
  proof::check const c = proof::self_check<hive::state>(hive::geometric_mean());
  ASSERT_TRUE(c) << c;
}

TEST(Plumbing, KnownAnswer) {
  proof::beta_binomial const known(2.0, 2.0, 7, 9);
  sy::pipeline const pipe{known.sampler(), known.weighter()};
  sy::estimate const share = pipe.expectation({.size = 10'000}, [](double p) { return p; });
  EXPECT_TRUE(proof::agrees(share, known.mean())) << share;
  EXPECT_EQ(proof::agrees(share, known.mean(), {.difference = 1e-9}).result(), proof::outcome::cannot_certify);
  EXPECT_EQ(proof::agrees(share, 0.5).result(), proof::outcome::failed);
}
