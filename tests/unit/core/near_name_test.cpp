#include "core/near_name.hpp"

#include <gtest/gtest.h>

#include <vector>

namespace stillzone::core {
namespace {

const std::vector<std::string> kKeys = {"volume", "gas", "temperature", "S_ac", "S_aa"};

TEST(NearName, SlipsOfTheFingerAreUnderstood) {
  EXPECT_EQ(nearest_name("volum", kKeys), "volume");   // left out
  EXPECT_EQ(nearest_name("vloume", kKeys), "volume");  // swapped
  EXPECT_EQ(nearest_name("temprature", kKeys), "temperature");
  EXPECT_EQ(nearest_name("Volume", kKeys), "volume");  // case
  EXPECT_EQ(nearest_name("S_AC", kKeys), "S_ac");
  EXPECT_EQ(nearest_name("gass", kKeys), "gas");
}

TEST(NearName, NothingNearIsNothing) {
  EXPECT_FALSE(nearest_name("headspace", kKeys).has_value());
  EXPECT_FALSE(nearest_name(std::string(100000, 'v'), kKeys).has_value());
  EXPECT_FALSE(nearest_name("volume", std::vector<std::string>{}).has_value());
}

TEST(NameHint, OffersTheNearestElseAllOrTheFirstTwelve) {
  EXPECT_EQ(name_hint("volum", kKeys), "Did you mean \"volume\"?");
  EXPECT_EQ(name_hint("headspace", kKeys), "Known are: volume, gas, temperature, S_ac, S_aa.");
  EXPECT_EQ(name_hint("x", std::vector<std::string>{}), "");
  const std::vector<std::string> many(20, "zone");
  EXPECT_EQ(name_hint("headspace", many),
            "Known are: zone, zone, zone, zone, zone, zone, zone, zone, zone, zone, zone, zone, "
            "...");
}

}  // namespace
}  // namespace stillzone::core
