#include "network/flow_balance.hpp"

#include <gmock/gmock.h>
#include <gtest/gtest.h>

#include <cmath>
#include <nlohmann/json.hpp>

#include "tests/unit/network/network_support.hpp"

namespace stillzone::network {
namespace {

using ::testing::ElementsAre;
using ::testing::IsEmpty;

/// Rates [m3/d] are exact to rounding.
constexpr double kRounding = 1e-10;

void expect_rates(const std::vector<double>& rates, const std::vector<double>& expected) {
  ASSERT_EQ(rates.size(), expected.size());
  for (std::size_t i = 0; i < rates.size(); ++i) {
    EXPECT_NEAR(rates[i], expected[i], kRounding) << "stream " << i;
  }
}

TEST(FlowBalance, OneTankPassesItsFeedOn) {
  NetworkSketch net;
  net.zone("tank").feed("sludge", 170.0).outlet("overflow");
  net.rest("sludge", "tank").rest("tank", "overflow");
  expect_rates(rates_of(net.the_case()), {170.0, 170.0});
}

TEST(FlowBalance, TheRestOfAFeedGoesWhereNoShareIsGiven) {
  NetworkSketch net;
  net.zone("core").zone("rim").feed("sludge", 170.0).outlet("overflow");
  net.share("sludge", "core", 0.85)
      .rest("sludge", "rim")
      .rest("core", "rim")
      .rest("rim", "overflow");
  expect_rates(rates_of(net.the_case()), {144.5, 25.5, 144.5, 170.0});
}

TEST(FlowBalance, ABypassMeetsNoZone) {
  NetworkSketch net;
  net.zone("tank").feed("sludge", 100.0).outlet("overflow");
  net.share("sludge", "overflow", 0.15).rest("sludge", "tank").rest("tank", "overflow");
  expect_rates(rates_of(net.the_case()), {15.0, 85.0, 85.0});
}

// The network of the complete case in README's format: the core is fed by one-way flow and left by
// exchanges alone. What enters it goes on to the rim on top of their exchange; the floor, a dead
// end, exchanges equal flows. By hand: 0.85 * 170 = 144.5; 170 - 144.5 = 25.5.
TEST(FlowBalance, AnExchangeCarriesTheNetFlowThatHasNoOtherWay) {
  NetworkSketch net;
  net.zone("core", 2550.0).zone("floor", 680.0).zone("rim", 170.0);
  net.feed("sludge", 170.0).outlet("overflow");
  net.schedule("mixing", {.every = 1.0 / 24.0, .on_for = 12.0 / 1440.0}, 0.05);
  net.share("sludge", "core", 0.85).rest("sludge", "rim").rest("rim", "overflow");
  net.exchange("core", "floor", 120.0).exchange("core", "rim", 2500.0).flow_follows("mixing");
  const Balanced result = balanced(net.the_case());
  ASSERT_TRUE(result.balance) << result.faults;
  const double mean = 2500.0 * (0.2 + 0.05 * 0.8);
  expect_rates(result.balance->mean_rates(net.the_case(), 0.0),
               {144.5, 25.5, 170.0, 120.0, 120.0, mean + 144.5, mean});
  expect_rates(result.balance->rates_at(net.the_case(), 0.0),
               {144.5, 25.5, 170.0, 120.0, 120.0, 2644.5, 2500.0});
  expect_rates(result.balance->rates_at(net.the_case(), 0.03),
               {144.5, 25.5, 170.0, 120.0, 120.0, 269.5, 125.0});
  EXPECT_THAT(result.balance->warnings(), IsEmpty());
  EXPECT_LE(
      result.balance->closure_error(net.the_case(), result.balance->rates_at(net.the_case(), 0.03)),
      1e-15);
}

TEST(FlowBalance, ATrainOfTanksJoinedByExchangesPassesTheFeedOn) {
  NetworkSketch net;
  net.zone("first").zone("middle").zone("last").feed("sludge", 150.0).outlet("overflow");
  net.rest("sludge", "first").exchange("middle", "first", 60.0).exchange("middle", "last", 70.0);
  net.rest("last", "overflow");
  expect_rates(rates_of(net.the_case()), {150.0, 60.0, 210.0, 220.0, 70.0, 150.0});
}

// Two equal routes of exchanges from a to d; one twice as strong. Pipes: the net flow through a
// route of two exchanges E in series is proportional to E.
TEST(FlowBalance, NetFlowDividesOverParallelRoutesOfExchangesAndSaysSo) {
  NetworkSketch net;
  net.zone("a").zone("b").zone("c").zone("d").feed("sludge", 90.0).outlet("overflow");
  net.rest("sludge", "a").exchange("a", "b", 200.0).exchange("b", "d", 200.0);
  net.exchange("a", "c", 100.0).exchange("c", "d", 100.0).rest("d", "overflow");
  const Balanced result = balanced(net.the_case());
  ASSERT_TRUE(result.balance) << result.faults;
  expect_rates(result.balance->mean_rates(net.the_case(), 0.0),
               {90.0, 260.0, 200.0, 260.0, 200.0, 130.0, 100.0, 130.0, 100.0, 90.0});
  EXPECT_THAT(
      result.balance->warnings(),
      ElementsAre("the net flow through 4 exchanges, such as \"a\" and \"b\" (/flows/1), has "
                  "more than one way to go; it was divided in proportion to the exchanges. "
                  "Give it as a one-way flow where you know it"));
}

TEST(FlowBalance, StagnantZonesInARingExchangeEqualFlowsWithoutAWarning) {
  NetworkSketch net;
  net.zone("core").zone("north").zone("south").feed("sludge", 90.0).outlet("overflow");
  net.rest("sludge", "core").rest("core", "overflow");
  net.exchange("core", "north", 10.0)
      .exchange("north", "south", 20.0)
      .exchange("south", "core", 30.0);
  const Balanced result = balanced(net.the_case());
  ASSERT_TRUE(result.balance) << result.faults;
  expect_rates(result.balance->mean_rates(net.the_case(), 0.0),
               {90.0, 90.0, 10.0, 10.0, 20.0, 20.0, 30.0, 30.0});
  EXPECT_THAT(result.balance->warnings(), IsEmpty());
}

// Shares in loops, by hand: tank a receives 100 + r, sends half on and half round:
// T = 100 + T/2 -> T = 200.
TEST(FlowBalance, SharesInARecirculationAreSolvedTogether) {
  NetworkSketch net;
  net.zone("a").zone("b").feed("sludge", 100.0).outlet("overflow");
  net.rest("sludge", "a").share("a", "b", 0.5).rest("a", "overflow").rest("b", "a");
  expect_rates(rates_of(net.the_case()), {100.0, 100.0, 100.0, 100.0});
}

// Three tanks, each sharing to the others: T = f + P' T solved by elimination by hand:
// a: T_a = 60 + 0.2 T_b; b: T_b = 40 + 0.5 T_a; -> T_a = 68/0.9, T_b = 70/0.9.
TEST(FlowBalance, SharesOfTwoTanksThatFeedEachOtherMatchTheHandCalculation) {
  NetworkSketch net;
  net.zone("a").zone("b").feed("sludge", 100.0).outlet("overflow");
  net.share("sludge", "a", 0.6).rest("sludge", "b").share("a", "b", 0.5).rest("a", "overflow");
  net.share("b", "a", 0.2).share("b", "overflow", 0.8);
  const double a = 68.0 / 0.9;
  const double b = 70.0 / 0.9;
  expect_rates(rates_of(net.the_case()), {60.0, 40.0, 0.5 * a, 0.5 * a, 0.2 * b, 0.8 * b});
}

TEST(FlowBalance, AGivenFlowBesideASharesTheRestOfTheThroughflow) {
  NetworkSketch net;
  net.zone("a").zone("b").feed("sludge", 100.0).outlet("overflow").outlet("drain");
  net.rest("sludge", "a").share("a", "b", 0.25).given("a", "drain", 75.0).rest("b", "overflow");
  expect_rates(rates_of(net.the_case()), {100.0, 25.0, 75.0, 25.0});
}

TEST(FlowBalance, ARedundantFlowThatAgreesIsAccepted) {
  NetworkSketch net;
  net.zone("tank").feed("sludge", 170.0).outlet("overflow");
  net.given("sludge", "tank", 170.0).given("tank", "overflow", 170.00001);
  EXPECT_EQ(balanced(net.the_case()).faults, "");
}

TEST(FlowBalance, SharesRoundedToSevenDigitsStillCloseTheBalance) {
  NetworkSketch net;
  net.zone("a").zone("b").zone("c").feed("sludge", 100.0).outlet("o");
  net.share("sludge", "a", 0.3333333)
      .share("sludge", "b", 0.3333333)
      .share("sludge", "c", 0.3333333);
  net.rest("a", "o").rest("b", "o").rest("c", "o");
  const auto rates = rates_of(net.the_case());
  EXPECT_NEAR(rates[0] + rates[1] + rates[2], 100.0, kRounding);
}

TEST(FlowBalance, AScheduledFeedBringsItsMeanFlowInPulses) {
  NetworkSketch net;
  net.zone("tank").feed("sludge", 100.0).outlet("overflow");
  net.schedule("pulse", {.every = 1.0, .on_for = 0.25}, 0.2).feed_follows("pulse");
  net.rest("sludge", "tank").rest("tank", "overflow");
  const Balanced result = balanced(net.the_case());
  ASSERT_TRUE(result.balance) << result.faults;
  const double on = 100.0 / (0.25 + 0.2 * 0.75);
  expect_rates(result.balance->mean_rates(net.the_case(), 0.0), {100.0, 100.0});
  expect_rates(result.balance->rates_at(net.the_case(), 0.0), {on, on});
  expect_rates(result.balance->rates_at(net.the_case(), 0.5), {0.2 * on, 0.2 * on});
}

TEST(FlowBalance, AFeedRecordMovesWhatDependsOnIt) {
  NetworkSketch net;
  net.zone("tank").feed("sludge", 0.0).feed_record({0.0, 2.0}, {100.0, 140.0}).outlet("overflow");
  net.share("sludge", "overflow", 0.1).rest("sludge", "tank").rest("tank", "overflow");
  const Balanced result = balanced(net.the_case());
  ASSERT_TRUE(result.balance) << result.faults;
  expect_rates(result.balance->rates_at(net.the_case(), 1.0), {10.0, 90.0, 90.0});
  expect_rates(result.balance->rates_at(net.the_case(), 2.0), {14.0, 126.0, 126.0});
}

TEST(FlowBalance, AFlowThatIsAlwaysZeroIsAWarning) {
  NetworkSketch net;
  net.zone("a").zone("b").feed("sludge", 100.0).outlet("o");
  net.rest("sludge", "a")
      .rest("a", "b")
      .rest("b", "o")
      .given("b", "a", 0.0)
      .exchange("a", "b", 0.0);
  const Balanced result = balanced(net.the_case());
  ASSERT_TRUE(result.balance) << result.faults;
  EXPECT_THAT(result.balance->warnings(),
              ElementsAre("the flow from \"b\" to \"a\" (/flows/3) is 0 at all times",
                          "the flow between \"a\" and \"b\" (/flows/4) is 0 at all times"));
}

}  // namespace
}  // namespace stillzone::network
