#include <gmock/gmock.h>
#include <gtest/gtest.h>

#include <random>

#include "network/flow_system.hpp"
#include "tests/unit/network/network_support.hpp"

// Networks as a modeller would write them, few flows given, against their transport matrices
//   A_ij = q(j -> i) / V_i,  A_ii = -(what leaves i) / V_i   [1/d]
// written out by hand from the flows in the comment over each, and large networks.

namespace stillzone::network {
namespace {

using Matrix = std::vector<std::vector<double>>;

Matrix transport_matrix(const Case& the_case) {
  const Balanced result = balanced(the_case);
  if (!result.balance) throw std::invalid_argument(result.faults);
  const auto rates = result.balance->mean_rates(the_case, 0.0);
  const std::size_t n = the_case.zones.size();
  Matrix a(n, std::vector<double>(n, 0.0));
  for (std::size_t s = 0; s < rates.size(); ++s) {
    const Stream& stream = result.balance->streams()[s];
    if (stream.from.kind != Place::Kind::zone) continue;
    const std::size_t from = stream.from.index;
    a[from][from] -= rates[s] / the_case.zones[from].volume.value();
    if (stream.to.kind != Place::Kind::zone) continue;
    a[stream.to.index][from] += rates[s] / the_case.zones[stream.to.index].volume.value();
  }
  return a;
}

void expect_matrix(const Matrix& found, const Matrix& expected) {
  ASSERT_EQ(found.size(), expected.size());
  for (std::size_t i = 0; i < found.size(); ++i) {
    for (std::size_t j = 0; j < found.size(); ++j) {
      EXPECT_NEAR(found[i][j], expected[i][j], 1e-14) << i << " " << j;
    }
  }
}

// Mixed zone 2250 m3 with a stagnant zone 750 m3 that exchanges 45 m3/d; feed 150 m3/d.
TEST(FlowNetworks, MixedZoneWithAStagnantZone) {
  NetworkSketch net;
  net.zone("mixed", 2250).zone("stagnant", 750).feed("sludge", 150).outlet("o");
  net.rest("sludge", "mixed").exchange("mixed", "stagnant", 45).rest("mixed", "o");
  expect_matrix(transport_matrix(net.the_case()),
                {{-195.0 / 2250, 45.0 / 2250}, {45.0 / 750, -45.0 / 750}});
}

// 30 of 150 m3/d leave the first zone; 120 go on to the second, which exchanges 80 with it.
TEST(FlowNetworks, TwoZonesThatAreBothDrawnFrom) {
  NetworkSketch net;
  net.zone("first", 1800).zone("second", 1200).feed("sludge", 150).outlet("o");
  net.rest("sludge", "first").given("first", "o", 30).rest("first", "second");
  net.exchange("first", "second", 80).rest("second", "o");
  expect_matrix(transport_matrix(net.the_case()),
                {{-230.0 / 1800, 80.0 / 1800}, {200.0 / 1200, -200.0 / 1200}});
}

// 10 % of the feed enters the second zone; 200 m3/d return to the inlet zone; a stagnant zone.
TEST(FlowNetworks, InletZoneWithReturnAndStagnantZone) {
  NetworkSketch net;
  net.zone("inlet", 300).zone("main", 1900).zone("stagnant", 800).feed("sludge", 150).outlet("o");
  net.share("sludge", "main", 0.1).rest("sludge", "inlet").rest("inlet", "main");
  net.given("main", "inlet", 200).exchange("main", "stagnant", 25).rest("main", "o");
  expect_matrix(transport_matrix(net.the_case()), {{-335.0 / 300, 200.0 / 300, 0},
                                                   {335.0 / 1900, -375.0 / 1900, 25.0 / 1900},
                                                   {0, 25.0 / 800, -25.0 / 800}});
}

// Five tanks of 600 m3, 210 m3/d forward and 60 back, written as exchanges of 60 alone: the feed of
// 150 finds its way through them.
TEST(FlowNetworks, FiveTanksWithBackmixingWrittenAsExchanges) {
  NetworkSketch net;
  for (const char* name : {"1", "2", "3", "4", "5"}) net.zone(name, 600);
  net.feed("sludge", 150).outlet("o").rest("sludge", "1").rest("5", "o");
  net.exchange("1", "2", 60).exchange("3", "2", 60).exchange("3", "4", 60).exchange("5", "4", 60);
  const double f = 210.0 / 600;
  const double b = 60.0 / 600;
  expect_matrix(transport_matrix(net.the_case()), {{-f, b, 0, 0, 0},
                                                   {f, -f - b, b, 0, 0},
                                                   {0, f, -f - b, b, 0},
                                                   {0, 0, f, -f - b, b},
                                                   {0, 0, 0, f, -f}});
}

constexpr std::size_t kSide = 100;  // 10,000 zones

/// Zones in a square, feed into the first, outlet from the last.
NetworkSketch square(std::size_t side = kSide) {
  NetworkSketch net;
  for (std::size_t i = 0; i < side * side; ++i) net.zone("z");
  net.feed("sludge", 1000.0).outlet("o");
  const auto add = [&](Place from, Place to) {
    Flow flow;
    flow.from = from;
    flow.to = to;
    net.the_case().flows.push_back(flow);
  };
  add({Place::Kind::feed, 0}, {Place::Kind::zone, 0});
  add({Place::Kind::zone, side * side - 1}, {Place::Kind::outlet, 0});
  return net;
}

Flow between(std::size_t from, std::size_t to) {
  Flow flow;
  flow.from = {Place::Kind::zone, from};
  flow.to = {Place::Kind::zone, to};
  return flow;
}

void expect_closed(const Case& the_case) {
  const Balanced result = balanced(the_case);
  ASSERT_EQ(result.faults, "");
  const auto rates = result.balance->mean_rates(the_case, 0.0);
  EXPECT_LE(result.balance->closure_error(the_case, rates), 1e-10);
}

// A flow field: eddies of given flow over all cells of the square, and a path to and fro through
// all zones whose flows continuity must find. 49,000 flows, 10,000 of them unknown.
TEST(FlowNetworks, TenThousandZonesWithAGivenFlowFieldClose) {
  NetworkSketch net = square();
  auto& flows = net.the_case().flows;
  std::mt19937 random(7);
  std::uniform_real_distribution<double> strength(1.0, 9.0);
  for (std::size_t i = 0; i + 1 < kSide; ++i) {
    for (std::size_t j = 0; j + 1 < kSide; ++j) {
      const std::size_t corner = i * kSide + j;
      const std::size_t ring[] = {corner, corner + 1, corner + kSide + 1, corner + kSide, corner};
      const double flow = strength(random);
      for (std::size_t k = 0; k < 4; ++k) {
        flows.push_back(between(ring[k], ring[k + 1]));
        flows.back().given = core::FlowRate(flow);
      }
    }
  }
  const auto on_path = [](std::size_t k) {
    const std::size_t row = k / kSide;
    const std::size_t along = k % kSide;
    return row * kSide + (row % 2 == 0 ? along : kSide - 1 - along);
  };
  std::size_t last = 0;
  for (std::size_t k = 1; k < kSide * kSide; ++k) {
    flows.push_back(between(last, on_path(k)));
    last = on_path(k);
  }
  flows[1].from.index = last;
  expect_closed(net.the_case());
}

// Every zone shares what it gets between its neighbours: all its unknowns hang together.
TEST(FlowNetworks, TenThousandZonesJoinedBySharesClose) {
  NetworkSketch net = square();
  constexpr std::size_t side = kSide;
  auto& flows = net.the_case().flows;
  for (std::size_t i = 0; i < side; ++i) {
    for (std::size_t j = 0; j < side; ++j) {
      const std::size_t here = i * side + j;
      std::vector<std::pair<std::size_t, double>> next;
      if (j > 0) next.emplace_back(here - 1, 0.15);
      if (j + 1 < side) next.emplace_back(here + 1, 0.4);
      if (i + 1 < side) next.emplace_back(here + side, 0.35);
      for (const auto& [to, share] : next) {
        flows.push_back(between(here, to));
        // The last on the list takes the rest; the last zone's rest leaves by the outlet.
        if (to != next.back().first || here + 1 == side * side) {
          flows.back().share = core::Share(share);
        }
      }
    }
  }
  expect_closed(net.the_case());
}

// A mesh of exchanges alone: the feed finds its way through all of them.
TEST(FlowNetworks, TenThousandZonesJoinedByExchangesClose) {
  NetworkSketch net = square();
  auto& flows = net.the_case().flows;
  for (std::size_t i = 0; i < kSide; ++i) {
    for (std::size_t j = 0; j < kSide; ++j) {
      for (const std::size_t to :
           {j + 1 < kSide ? i * kSide + j + 1 : 0U, i + 1 < kSide ? (i + 1) * kSide + j : 0U}) {
        if (to == 0) continue;
        flows.push_back(between(i * kSide + j, to));
        flows.back().exchange = true;
        flows.back().given = core::FlowRate(500.0);
      }
    }
  }
  expect_closed(net.the_case());
}

TEST(FlowSystem, FreeDirectionsMeetEveryRow) {
  // x0 + x1 = x2, x2 = x3 + x4, x3 known: 5 variables, 2 rows, 2 free.
  const FlowSystem system({{{0, 1.0}, {1, 1.0}, {2, -1.0}}, {{2, 1.0}, {3, -1.0}, {4, -1.0}}},
                          {false, false, false, true, false});
  EXPECT_EQ(system.n_free(), 2U);
  const auto directions = system.free_directions(10);
  ASSERT_EQ(directions.size(), 2U);
  for (const auto& direction : directions) {
    std::vector<double> x(5, 0.0);
    for (const FlowSystem::Term& term : direction) x[term.variable] = term.factor;
    EXPECT_DOUBLE_EQ(x[3], 0.0);
    EXPECT_NEAR(x[0] + x[1] - x[2], 0.0, 1e-15);
    EXPECT_NEAR(x[2] - x[3] - x[4], 0.0, 1e-15);
  }
}

TEST(FlowSystem, ALoopOfEquationsIsSolvedTogether) {
  // a = 1 + b/2, b = 2 + a/4 -> a = 16/7, b = 18/7 (known variable 2 is 1).
  const FlowSystem system({{{0, 1.0}, {1, -0.5}, {2, -1.0}}, {{1, 1.0}, {0, -0.25}, {2, -2.0}}},
                          {false, false, true});
  std::vector<double> x = {0.0, 0.0, 1.0};
  system.substitute(x);
  EXPECT_NEAR(x[0], 16.0 / 7.0, 1e-14);
  EXPECT_NEAR(x[1], 18.0 / 7.0, 1e-14);
}

/// Equations of one closed ring of n variables with each row twice: x_i = 0.5 x_(i+1) + 1.
TEST(FlowSystem, ALargeCoreWithRepeatedRowsIsSolvedBySparseOrthogonalFactors) {
  constexpr std::size_t n = 300;
  std::vector<FlowSystem::Row> rows;
  for (std::size_t i = 0; i < 2 * n; ++i) {
    rows.push_back({{i % n, 1.0}, {(i + 1) % n, -0.5}, {n, -1.0}});
  }
  std::vector<bool> known(n + 1, false);
  known[n] = true;
  const FlowSystem system(rows, known);
  EXPECT_EQ(system.n_free(), 0U);
  std::vector<double> x(n + 1, 0.0);
  x[n] = 1.0;
  system.substitute(x);
  for (std::size_t i = 0; i < n; ++i) EXPECT_NEAR(x[i], 2.0, 1e-12);
}

TEST(FlowSystem, ALargeLoopWithoutAGivenFlowHasOneFreeDirection) {
  constexpr std::size_t n = 300;  // x_i = x_(i+1) all round, every row twice
  std::vector<FlowSystem::Row> rows;
  for (std::size_t i = 0; i < 2 * n; ++i) rows.push_back({{i % n, 1.0}, {(i + 1) % n, -1.0}});
  const FlowSystem system(rows, std::vector<bool>(n, false));
  EXPECT_EQ(system.n_free(), 1U);
  const auto directions = system.free_directions(3);
  ASSERT_EQ(directions.size(), 1U);
  ASSERT_EQ(directions[0].size(), n);
  for (const FlowSystem::Term& term : directions[0]) {
    EXPECT_NEAR(term.factor, directions[0][0].factor, 1e-10);
  }
}

}  // namespace
}  // namespace stillzone::network
