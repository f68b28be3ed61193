// Transport between zones against closed results of linear compartment networks.
// Source of the numbers: data/compartment_networks.json, invented networks solved with SciPy
// (matrix exponential and linear solves); that the unconverted share of a first-order reaction is
// the Laplace transform of the residence-time distribution: Danckwerts (1953), Continuous flow
// systems: distribution of residence times, Chem. Eng. Sci. 2.
#include <gtest/gtest.h>

#include <fmt/format.h>

#include <Eigen/Dense>
#include <fstream>
#include <nlohmann/json.hpp>
#include <string>
#include <unsupported/Eigen/MatrixFunctions>

#include "tests/case_runner.hpp"

namespace stillzone::testing {
namespace {

using nlohmann::json;

const char* const kNetworks[] = {"single_tank",
                                 "two_zone",
                                 "two_zone_both_draw",
                                 "three_zone_short_circuit",
                                 "three_zone_bypass_outlet",
                                 "chain5_backmix",
                                 "two_series_equal"};

json networks() {
  std::ifstream file(std::string(STILLZONE_SOURCE_DIR) +
                     "/tests/published/data/compartment_networks.json");
  return json::parse(file);
}

std::string quantity(double value, const char* unit) {
  return fmt::format("{:.17g} {}", value, unit);
}

/// The network as a case; the feed carries 1 of `component`.
std::unique_ptr<LoadedCase> network_case(const json& network, const json& kinetics,
                                         const std::string& component, const json& run_block) {
  json c;
  c["stillzone"] = "case/1";
  c["title"] = "linear network";
  c["kinetics"] = kinetics;
  c["temperature"] = "35 degC";
  const auto zone = [](std::size_t z) { return fmt::format("z{}", z); };
  double fed = 0.0;
  for (std::size_t z = 0; z < network["V_m3"].size(); ++z) {
    c["zones"][zone(z)]["volume"] = quantity(network["V_m3"][z], "m3");
    const double in = network["Qin_m3_d"][z];
    const double out = network["out_m3_d"][z];
    fed += in;
    if (in > 0.0) {
      c["flows"].push_back({{"from", "feed"}, {"to", zone(z)}, {"flow", quantity(in, "m3/d")}});
    }
    if (out > 0.0) {
      c["flows"].push_back({{"from", zone(z)}, {"to", "out"}, {"flow", quantity(out, "m3/d")}});
    }
  }
  for (const json& link : network["links_from_to_m3_d"]) {
    c["flows"].push_back(
        {{"from", zone(link[0])}, {"to", zone(link[1])}, {"flow", quantity(link[2], "m3/d")}});
  }
  c["feeds"]["feed"] = {{"flow", quantity(fed, "m3/d")}, {"state", {{component, 1.0}}}};
  c["outlets"] = {"out"};
  c["run"] = run_block;
  return load_text(c.dump());
}

class LinearNetwork : public ::testing::TestWithParam<const char*> {};

TEST_P(LinearNetwork, FirstOrderConversionIsTheLaplaceTransformOfItsResidenceTimes) {
  const json network = networks()[GetParam()];
  for (const auto& [rate, unconverted] : network["first_order_unconverted"].items()) {
    const auto loaded =
        network_case(network, {{"model", "first_order"}, {"set", {{"k_hyd", rate + " 1/d"}}}},
                     "X_degradable", {{"kind", "steady"}, {"start", "seeded"}});
    ASSERT_NE(loaded, nullptr);
    const network::RunResult result = run(*loaded);
    ASSERT_EQ(result.outlets.size(), 1U);
    EXPECT_NEAR(value_in(result.outlets[0].state.state, "X_degradable"), unconverted.get<double>(),
                1e-10)
        << rate;
    const json& profile = network["first_order_zone_profile"][rate];
    for (std::size_t z = 0; z < profile.size(); ++z) {
      EXPECT_NEAR(value_in(result.zones[z].state, "X_degradable"), profile[z].get<double>(), 1e-10)
          << rate << ", zone " << z;
    }
  }
}

/// The washed-in tracer leaves as F(t); run at 1e-8, compared to 1e-6 (of the inflow's 1).
TEST_P(LinearNetwork, StepOfTracerLeavesAsTheCumulativeResidenceTimeCurve) {
  const json network = networks()[GetParam()];
  for (const char* integrator : {"multistep", "one-step"}) {
    const auto loaded = network_case(network, "inert", "S_tracer",
                                     {{"kind", "dynamic"},
                                      {"start", json::object({{"z0", {{"S_tracer", 0.0}}}})},
                                      {"until", "60 d"},
                                      {"record_every", "0.5 d"},
                                      {"tolerance", 1e-8},
                                      {"integrator", integrator}});
    ASSERT_NE(loaded, nullptr);
    const network::RunResult result = run(*loaded);
    for (const auto& [time, share] : network["F"].items()) {
      EXPECT_NEAR(series_value(result.series, "out", "S_tracer", std::stod(time)),
                  share.get<double>(), 1e-6)
          << integrator << " at " << time << " d";
    }
  }
}

/// c(t) = c_steady + exp(A t) (c_0 - c_steady) in every zone, from a start of its own.
TEST_P(LinearNetwork, TracerHistoriesAreThoseOfTheMatrixExponential) {
  const json network = networks()[GetParam()];
  const auto n = static_cast<Eigen::Index>(network["V_m3"].size());
  Eigen::MatrixXd a(n, n);
  Eigen::VectorXd fed(n);
  Eigen::VectorXd start(n);
  json given;
  for (Eigen::Index z = 0; z < n; ++z) {
    const auto k = static_cast<std::size_t>(z);
    for (Eigen::Index from = 0; from < n; ++from) {
      a(z, from) = network["A_per_d"][k][static_cast<std::size_t>(from)];
    }
    fed(z) = network["Qin_m3_d"][k].get<double>() / network["V_m3"][k].get<double>();
    start(z) = 0.3 + 0.9 * static_cast<double>(z);
    given[fmt::format("z{}", z)]["S_tracer"] = start(z);
  }
  const Eigen::VectorXd steady = -a.partialPivLu().solve(fed);
  const auto loaded = network_case(network, "inert", "S_tracer",
                                   {{"kind", "dynamic"},
                                    {"start", given},
                                    {"until", "40 d"},
                                    {"record_every", "1 d"},
                                    {"tolerance", 1e-9},
                                    {"integrator", "one-step"}});
  ASSERT_NE(loaded, nullptr);
  const network::RunResult result = run(*loaded);
  for (const double t : {1.0, 2.0, 5.0, 13.0, 40.0}) {
    const Eigen::MatrixXd at = a * t;
    const Eigen::VectorXd c = steady + at.exp() * (start - steady);
    for (Eigen::Index z = 0; z < n; ++z) {
      EXPECT_NEAR(series_value(result.series, fmt::format("z{}", z), "S_tracer", t), c(z), 1e-7)
          << "zone " << z << " at " << t << " d";
    }
  }
}

INSTANTIATE_TEST_SUITE_P(Networks, LinearNetwork, ::testing::ValuesIn(kNetworks),
                         [](const auto& test) { return std::string(test.param); });

}  // namespace
}  // namespace stillzone::testing
