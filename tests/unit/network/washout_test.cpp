#include <gtest/gtest.h>

#include <cmath>
#include <string>

#include "core/dae/steady_state.hpp"
#include "network/washout/ideal_tank.hpp"
#include "network/washout/load_curve.hpp"
#include "network/washout/loaded_digester.hpp"
#include "network/washout/transport_criterion.hpp"
#include "network/washout/washout_analysis.hpp"
#include "tests/case_runner.hpp"

namespace stillzone::network {
namespace {

using stillzone::testing::load_file;
using stillzone::testing::load_text;

std::string case_path(const char* name) {
  return std::string(STILLZONE_SOURCE_DIR) + "/cases/" + name + ".json";
}

std::string inert_case(const std::string& flows) {
  return R"({ "stillzone": "case/1", "title": "t", "kinetics": "inert", "temperature": "35 degC",
    "zones": { "a": { "volume": "100 m3" }, "b": { "volume": "50 m3" } },
    "feeds": { "f": { "flow": "10 m3/d", "state": {} } }, "outlets": ["out"],
    "flows": [)" +
         flows + R"(], "run": { "kind": "steady" } })";
}

double rate_of(const LoadFlows& flows, double load, std::size_t stream) {
  return flows.at(load).rates[stream];
}

TEST(LoadFlows, FeedScalesAndExchangeStays) {
  const auto loaded = load_text(inert_case(
      R"({ "from": "f", "to": "a" }, { "between": ["a", "b"], "flow": "7 m3/d" }, { "from": "a", "to": "out" })"));
  ASSERT_TRUE(loaded);
  const auto flows = LoadFlows::of(loaded->the_case, loaded->balance);
  ASSERT_TRUE(flows.has_value());
  EXPECT_DOUBLE_EQ(rate_of(*flows, 3.0, 0), 30.0);
  EXPECT_DOUBLE_EQ(rate_of(*flows, 3.0, 1), 7.0);
  EXPECT_DOUBLE_EQ(rate_of(*flows, 3.0, 2), 7.0);
  EXPECT_DOUBLE_EQ(rate_of(*flows, 3.0, 3), 30.0);
}

TEST(LoadFlows, GivenFlowOutOfAFeedScalesWithIt) {
  const auto loaded = load_text(inert_case(
      R"({ "from": "f", "to": "a", "flow": "8 m3/d" }, { "from": "f", "to": "out" },
         { "from": "a", "to": "b" }, { "from": "b", "to": "a", "flow": "5 m3/d" }, { "from": "b", "to": "out" })"));
  ASSERT_TRUE(loaded);
  const auto flows = LoadFlows::of(loaded->the_case, loaded->balance);
  ASSERT_TRUE(flows.has_value());
  EXPECT_DOUBLE_EQ(rate_of(*flows, 2.0, 0), 16.0);
  EXPECT_DOUBLE_EQ(rate_of(*flows, 2.0, 1), 4.0);
  EXPECT_DOUBLE_EQ(rate_of(*flows, 2.0, 3), 5.0);  // a return stays
  EXPECT_DOUBLE_EQ(rate_of(*flows, 2.0, 2), 21.0);
}

TEST(LoadFlows, GivenFlowOnTheOnlyWayThroughScales) {
  const auto loaded = load_text(inert_case(
      R"({ "from": "f", "to": "a" }, { "from": "a", "to": "b", "flow": "10 m3/d" }, { "from": "b", "to": "out" })"));
  ASSERT_TRUE(loaded);
  const auto flows = LoadFlows::of(loaded->the_case, loaded->balance);
  ASSERT_TRUE(flows.has_value());
  EXPECT_DOUBLE_EQ(rate_of(*flows, 2.0, 1), 20.0);
}

TEST(LoadedDigester, ParameterDerivativeIsThatOfTheRates) {
  const auto loaded = load_file(case_path("short_circuit_stagnant"));
  ASSERT_TRUE(loaded);
  const auto flows = LoadFlows::of(loaded->the_case, loaded->balance);
  ASSERT_TRUE(flows.has_value());
  LoadedDigester digester(loaded->the_case, loaded->balance, *flows);
  const std::size_t n = digester.system().n_unknowns();
  std::vector<double> y(n);
  for (std::size_t i = 0; i < n; ++i) y[i] = 0.1 + 0.01 * static_cast<double>(i % 17);
  std::vector<double> low(n), high(n), df(n);
  digester.set_parameter(1.0);
  digester.system().rates(y, low);
  digester.parameter_derivative(y, df);
  digester.set_parameter(2.0);
  digester.system().rates(y, high);
  for (std::size_t i = 0; i < n; ++i) {  // linear in the load: the difference is exact
    EXPECT_NEAR(high[i] - low[i], df[i], 1e-9 * (1.0 + std::abs(low[i]))) << i;
  }
}

TEST(IdealTank, HoldsAllVolumeAndAllFeeds) {
  const auto loaded = load_file(case_path("short_circuit_stagnant"));
  ASSERT_TRUE(loaded);
  const Case ideal = ideal_tank(loaded->the_case);
  ASSERT_EQ(ideal.zones.size(), 1u);
  EXPECT_DOUBLE_EQ(ideal.zones[0].volume.value(), 3000.0);
  EXPECT_NEAR(ideal.zones[0].gas->coefficient.value(), (2250.0 * 150.0 + 750.0 * 15.0) / 3000.0,
              1e-12);
  EXPECT_EQ(ideal.flows.size(), 2u);  // the bypass is gone
}

TEST(TransportCriterion, OneTankNeedsItsDilutionRate) {
  const auto loaded = load_file(case_path("ideal_tank"));
  ASSERT_TRUE(loaded);
  Operation operation(loaded->the_case, loaded->balance, Operation::Mode::mean);
  const auto matrix =
      transport_matrix(loaded->the_case, loaded->balance.streams(), operation.at(0.0).rates);
  EXPECT_NEAR(washout_rate(matrix).value_or(0.0), 170.0 / 3400.0, 1e-15);
}

/// Time integration as the judge of the critical load: just below it the digester stays where it
/// is, just above it sours.
TEST(LoadCurve, IntegrationAgreesWithTheCriticalLoadOfAnAdm1Tank) {
  const auto loaded = load_file(case_path("ideal_tank"));
  ASSERT_TRUE(loaded);
  const auto curve = trace_load_curve(loaded->the_case, loaded->balance, {});
  ASSERT_TRUE(curve.ok()) << curve.failure().text();
  ASSERT_EQ(curve.value().end, CurveEnd::fold);
  const double critical = curve.value().critical_load.value_or(0.0);
  const CurvePoint* before = nullptr;
  for (const CurvePoint& point : curve.value().points) {
    if (point.load >= 0.99 * critical) break;
    before = &point;
  }
  ASSERT_NE(before, nullptr);
  const auto flows = LoadFlows::of(loaded->the_case, loaded->balance);
  LoadedDigester digester(loaded->the_case, loaded->balance, *flows);
  const auto solver = core::make_klu_solver(digester.system().pattern());
  const auto ph = digester.digester().layout().n_components();
  const auto settled_ph = [&](double load) {
    digester.set_parameter(load);
    std::vector<double> y = before->y;
    EXPECT_TRUE(digester.system().make_consistent(y).ok());
    const auto report = core::find_steady_state(digester.system(), *solver, {}, y);
    EXPECT_TRUE(report.ok());
    return y[ph];
  };
  EXPECT_GT(settled_ph(critical * 0.999), 6.5);
  EXPECT_LT(settled_ph(critical * 1.001), 6.0);
}

TEST(Washout, PoorlyMixedTankFailsAtALoadTheIdealTankBears) {
  const auto loaded = load_file(case_path("near_washout"));
  ASSERT_TRUE(loaded);
  const auto found = analyse_washout(loaded->the_case, loaded->balance, {}, {});
  ASSERT_TRUE(found.ok()) << found.failure().text();
  const auto& washout = found.value();
  EXPECT_LT(washout.network.critical_load.value_or(9.0), 1.0);
  EXPECT_GT(washout.ideal.critical_load.value_or(0.0), 1.0);
  EXPECT_EQ(washout.ideal.today_is, "healthy");
  EXPECT_EQ(washout.network.today_is.rfind("soured", 0), 0u) << washout.network.today_is;
  ASSERT_TRUE(washout.network.first_to_fail.has_value());
  EXPECT_EQ(loaded->the_case.kinetics.groups[*washout.network.first_to_fail].name,
            "acetate degraders");
}

/// A zone behind a fixed exchange keeps its biomass at any load while the zone that is fed sours:
/// no fold warns of it.
TEST(LoadCurve, NetworkCanSourWithoutAFold) {
  const auto loaded =
      load_file(std::string(STILLZONE_SOURCE_DIR) + "/tests/published/adm1/s2.case.json");
  ASSERT_TRUE(loaded);
  const auto curve = trace_load_curve(loaded->the_case, loaded->balance, {});
  ASSERT_TRUE(curve.ok()) << curve.failure().text();
  EXPECT_FALSE(curve.value().critical_load.has_value());
  ASSERT_TRUE(curve.value().sour_load.has_value());
  EXPECT_GT(*curve.value().sour_load, 1.0);
  EXPECT_LT(*curve.value().sour_load, 4.0);
}

}  // namespace
}  // namespace stillzone::network
