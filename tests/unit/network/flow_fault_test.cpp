#include <gtest/gtest.h>

#include "tests/unit/network/network_support.hpp"

// The exact words for everything that can be wrong with a flow balance.

namespace stillzone::network {
namespace {

std::string faults_of(const NetworkSketch& net) { return balanced(net.the_case()).faults; }

TEST(FlowFault, ACutOffZoneIsNamed) {
  NetworkSketch net;
  net.zone("tank").zone("floor").zone("sump").feed("sludge", 100.0).outlet("o");
  net.rest("sludge", "tank").rest("tank", "o").exchange("floor", "sump", 5.0);
  EXPECT_EQ(faults_of(net),
            "net.json /zones/floor: zone \"floor\" is cut off: no feed reaches it and it reaches "
            "no outlet; every zone must take part in the flow. Join it with an exchange or with "
            "flows greater than 0, or take the zone out.\n"
            "net.json /zones/sump: zone \"sump\" is cut off: no feed reaches it and it reaches "
            "no outlet; every zone must take part in the flow. Join it with an exchange or with "
            "flows greater than 0, or take the zone out.\n");
}

TEST(FlowFault, AZoneNoFeedReaches) {
  NetworkSketch net;
  net.zone("tank").zone("side").feed("sludge", 100.0).outlet("o");
  net.rest("sludge", "tank").rest("tank", "o").rest("side", "tank");
  EXPECT_EQ(faults_of(net),
            "net.json /zones/side: no feed reaches zone \"side\"; every zone must be fed, by a "
            "flow or an exchange greater than 0. Add a flow or an exchange that leads to it.\n");
}

TEST(FlowFault, AZoneThatReachesNoOutlet) {
  NetworkSketch net;
  net.zone("tank").zone("trap").feed("sludge", 100.0).outlet("o");
  net.rest("sludge", "tank").rest("tank", "o").given("tank", "trap", 5.0);
  EXPECT_EQ(faults_of(net),
            "net.json /zones/trap: zone \"trap\" reaches no outlet; water that enters a zone "
            "must be able to leave. Add a flow from it to an outlet or to a zone that reaches "
            "one.\n");
}

TEST(FlowFault, AnExchangeOfZeroDoesNotFeedAZone) {
  NetworkSketch net;
  net.zone("tank").zone("floor").feed("sludge", 100.0).outlet("o");
  net.rest("sludge", "tank").rest("tank", "o").exchange("tank", "floor", 0.0);
  EXPECT_EQ(faults_of(net),
            "net.json /zones/floor: zone \"floor\" is cut off: no feed reaches it and it reaches "
            "no outlet; every zone must take part in the flow. Join it with an exchange or with "
            "flows greater than 0, or take the zone out.\n");
}

TEST(FlowFault, AFlowThatContinuityMakesZeroFeedsNothing) {
  NetworkSketch net;
  net.zone("tank").zone("side").feed("sludge", 100.0).outlet("o");
  net.share("sludge", "tank", 1.0).rest("sludge", "side").rest("tank", "o").rest("side", "o");
  EXPECT_EQ(faults_of(net),
            "net.json /zones/side: zone \"side\" is cut off: no feed reaches it and it reaches "
            "no outlet; every zone must take part in the flow. Join it with an exchange or with "
            "flows greater than 0, or take the zone out.\n");
}

TEST(FlowFault, AFeedAndAnOutletThatNothingJoins) {
  NetworkSketch net;
  net.zone("tank").feed("sludge", 100.0).feed("water", 5.0).outlet("o").outlet("drain");
  net.rest("sludge", "tank").rest("tank", "o");
  EXPECT_EQ(faults_of(net),
            "net.json /feeds/water: no flow leaves feed \"water\"; a feed must go somewhere. Add "
            "a flow from it or take the feed out.\n"
            "net.json /outlets/1: no flow enters outlet \"drain\"; an outlet must take "
            "something. Add a flow to it or take the outlet out.\n");
}

TEST(FlowFault, SharesOverOne) {
  NetworkSketch net;
  net.zone("a").zone("b").feed("sludge", 100.0).outlet("o");
  net.share("sludge", "a", 0.7).share("sludge", "b", 0.4).rest("a", "o").rest("b", "o");
  EXPECT_EQ(faults_of(net),
            "net.json /feeds/sludge: the shares that leave \"sludge\" add up to 1.1; together "
            "they take at most 1. Lower one of \"sludge\" to \"a\" (/flows/0), \"sludge\" to "
            "\"b\" (/flows/1).\n");
}

TEST(FlowFault, SharesUnderOneWithNothingToTakeTheRest) {
  NetworkSketch net;
  net.zone("a").zone("b").feed("sludge", 100.0).outlet("o");
  net.rest("sludge", "a").share("a", "b", 0.5).share("a", "o", 0.4).rest("b", "o");
  EXPECT_EQ(faults_of(net),
            "net.json /zones/a: the shares that leave \"a\" add up to 0.9; they must add up to 1 "
            "when no other flow takes the rest. Leave the share of one out, then it takes the "
            "rest: \"a\" to \"b\" (/flows/1), \"a\" to \"o\" (/flows/2).\n");
}

TEST(FlowFault, TwoRoutesOfUnknownFlow) {
  NetworkSketch net;
  net.zone("a").zone("b").feed("sludge", 100.0).outlet("o");
  net.rest("sludge", "a").rest("sludge", "b").rest("a", "o").rest("b", "o");
  EXPECT_EQ(faults_of(net),
            "net.json /flows/0: the flow from \"sludge\" to \"a\" is left open; continuity must "
            "fix every flow that is not given, and this one can change together with \"sludge\" "
            "to \"b\" (/flows/1), \"a\" to \"o\" (/flows/2), \"b\" to \"o\" (/flows/3). Give the "
            "\"flow\" or \"share\" of one of them.\n");
}

TEST(FlowFault, ALoopOfUnknownFlow) {
  NetworkSketch net;
  net.zone("a").zone("b").feed("sludge", 100.0).outlet("o");
  net.rest("sludge", "a").rest("a", "b").rest("b", "a").rest("b", "o");
  EXPECT_EQ(faults_of(net),
            "net.json /flows/1: the flow from \"a\" to \"b\" is left open; continuity must fix "
            "every flow that is not given, and this one can change together with \"b\" to \"a\" "
            "(/flows/2). Give the \"flow\" or \"share\" of one of them.\n");
}

TEST(FlowFault, TwoSeparateLoopsAreTwoFaults) {
  NetworkSketch net;
  net.zone("a").zone("b").zone("c").feed("sludge", 100.0).outlet("o");
  net.rest("sludge", "a")
      .rest("a", "b")
      .rest("b", "a")
      .rest("b", "c")
      .rest("c", "b")
      .rest("c", "o");
  EXPECT_EQ(faults_of(net),
            "net.json /flows/1: the flow from \"a\" to \"b\" is left open; continuity must fix "
            "every flow that is not given, and this one can change together with \"b\" to \"a\" "
            "(/flows/2). Give the \"flow\" or \"share\" of one of them.\n"
            "net.json /flows/3: the flow from \"b\" to \"c\" is left open; continuity must fix "
            "every flow that is not given, and this one can change together with \"c\" to \"b\" "
            "(/flows/4). Give the \"flow\" or \"share\" of one of them.\n");
}

TEST(FlowFault, AFeedWhoseFlowsDoNotAddUp) {
  NetworkSketch net;
  net.zone("a").feed("sludge", 170.0).outlet("o");
  net.given("sludge", "a", 180.0).rest("a", "o");
  EXPECT_EQ(
      faults_of(net),
      "net.json /feeds/sludge: feed \"sludge\" brings 170 m3/d and its flows take 180 "
      "m3/d; what flows in must flow out. Change one of the given flows, or leave its "
      "\"flow\" out: \"sludge\" to \"a\" (/flows/0); or change the flow of feed \"sludge\".\n");
}

TEST(FlowFault, AZoneWhoseGivenFlowsDoNotBalance) {
  NetworkSketch net;
  net.zone("a").zone("b").feed("sludge", 170.0).outlet("o");
  net.rest("sludge", "a").given("a", "b", 100.0).given("a", "o", 50.0).rest("b", "o");
  EXPECT_EQ(faults_of(net),
            "net.json /zones/a: zone \"a\" takes in 170 m3/d and gives off 150 m3/d; what flows "
            "in must flow out. Change one of the given flows, or leave its \"flow\" out: \"a\" "
            "to \"b\" (/flows/1), \"a\" to \"o\" (/flows/2); or change the flow of feed "
            "\"sludge\".\n");
}

TEST(FlowFault, AGroupOfZonesWhoseGivenFlowsDoNotBalance) {
  NetworkSketch net;
  net.zone("a").zone("b").feed("sludge", 170.0).outlet("o");
  net.rest("sludge", "a").rest("a", "b").given("b", "a", 50.0).given("b", "o", 100.0);
  EXPECT_EQ(faults_of(net),
            "net.json /zones/a: zones \"a\", \"b\" together take in 170 m3/d and give off 100 "
            "m3/d; what flows in must flow out. Change one of the given flows, or leave its "
            "\"flow\" out: \"b\" to \"o\" (/flows/3); or change the flow of feed \"sludge\".\n");
}

TEST(FlowFault, AShareThatContradictsAGivenFlow) {
  NetworkSketch net;
  net.zone("a").zone("b").feed("sludge", 100.0).outlet("o");
  net.share("sludge", "a", 0.5).given("sludge", "b", 60.0).rest("a", "o").rest("b", "o");
  EXPECT_EQ(faults_of(net),
            "net.json /feeds/sludge: the flows and shares given at \"sludge\" contradict each "
            "other: 100 m3/d in, 110 m3/d out; what flows in must flow out, in the shares given. "
            "Change one of them, or "
            "leave its \"flow\" or \"share\" out: \"sludge\" to \"a\" (/flows/0), \"sludge\" to "
            "\"b\" (/flows/1).\n");
}

TEST(FlowFault, AFlowThatComesOutNegative) {
  NetworkSketch net;
  net.zone("a").zone("b").feed("sludge", 100.0).outlet("o");
  net.rest("sludge", "a").given("a", "o", 130.0).rest("a", "b").rest("b", "o");
  EXPECT_EQ(faults_of(net),
            "net.json /flows/2: the flow from \"a\" to \"b\" comes out at -30 m3/d; a one-way "
            "flow must be >= 0. Swap \"from\" and \"to\" to turn it round, or change one of the "
            "given flows beside it: \"a\" to \"o\" (/flows/1).\n"
            "net.json /flows/3: the flow from \"b\" to \"o\" comes out at -30 m3/d; a one-way "
            "flow must be >= 0. Change the flows it depends on.\n");
}

TEST(FlowFault, AFlowThatTurnsNegativeWhileAPumpRuns) {
  NetworkSketch net;
  net.zone("a").zone("b").feed("sludge", 100.0).outlet("o");
  net.schedule("pump", {.every = 1.0, .on_for = 0.25}, 0.0);
  net.rest("sludge", "a").given("a", "b", 240.0).flow_follows("pump").rest("a", "o").rest("b", "o");
  EXPECT_EQ(faults_of(net),
            "net.json /flows/2: the flow from \"a\" to \"o\" comes out at -140 m3/d while "
            "\"pump\" is on; a one-way flow must be >= 0. Change one of the given flows beside "
            "it: \"a\" to \"b\" (/flows/1).\n");
}

TEST(FlowFault, AFlowThatTurnsNegativeInARecord) {
  NetworkSketch net;
  net.zone("a").zone("b").feed("sludge", 0.0).feed_record({0.0, 3.0}, {100.0, 60.0}).outlet("o");
  net.rest("sludge", "a").given("a", "b", 80.0).rest("a", "o").rest("b", "o");
  EXPECT_EQ(faults_of(net),
            "net.json /flows/2: the flow from \"a\" to \"o\" comes out at -20 m3/d at 3 d; a "
            "one-way flow must be >= 0. Change one of the given flows beside it: \"a\" to \"b\" "
            "(/flows/1).\n");
}

TEST(FlowFault, GivenFlowsThatBalanceOnlyOnAverage) {
  NetworkSketch net;
  net.zone("a").feed("sludge", 100.0).outlet("o");
  net.schedule("pulse", {.every = 1.0, .on_for = 0.5}, 0.0).feed_follows("pulse");
  net.rest("sludge", "a").given("a", "o", 100.0);
  EXPECT_EQ(faults_of(net),
            "net.json /zones/a: zone \"a\" takes in 200 m3/d and gives off 100 m3/d while "
            "\"pulse\" is on; what flows in must flow out. Change one of the given flows, or "
            "leave its \"flow\" out: \"a\" to \"o\" (/flows/1); or change the flow of feed "
            "\"sludge\".\n");
}

TEST(FlowFault, AFeedWhoseScheduleIsNeverOn) {
  NetworkSketch net;
  net.zone("a").feed("sludge", 100.0).outlet("o");
  net.the_case().schedules.push_back(
      {"never", core::Timeline::switched(core::Timeline::Periodic{1.0, 0.5, 0.0}, {},
                                         {{0.0, 1000.0}}, 0.0)});
  net.feed_follows("never").rest("sludge", "a").rest("a", "o");
  EXPECT_EQ(faults_of(net),
            "net.json /feeds/sludge/schedule: schedule \"never\" is never on; a feed's flow is "
            "its time mean, so its schedule must be on at times. Change the schedule or "
            "take it off the feed.\n");
}

}  // namespace
}  // namespace stillzone::network
