// Tracer histories in zone networks, exact by matrix exponentials: check values NET-1 to NET-9,
// RTD-28, RTD-29 in data/compartment_networks.json (invented networks; mpmath at 40 digits, SciPy
// and Octave agree). First-order conversion as the transform of E: Danckwerts (1953), Chem. Eng.
// Sci. 2:1.
#include <fmt/format.h>

#include <Eigen/Eigenvalues>
#include <cmath>
#include <fstream>

#include "network/tracer/network_model.hpp"
#include "network/tracer/network_residence.hpp"
#include "tests/tracer_support.hpp"

namespace stillzone::network {
namespace {

using nlohmann::json;

json networks() {
  std::ifstream file(STILLZONE_SOURCE_DIR "/tests/published/data/compartment_networks.json");
  return json::parse(file);
}

std::string quantity(double value, const char* unit) {
  return fmt::format("{:.17g} {}", value, unit);
}

/// A network of the file as a case with inert kinetics.
json case_of(const json& network) {
  json c = {{"stillzone", "case/1"},
            {"title", "linear network"},
            {"kinetics", "inert"},
            {"temperature", "35 degC"}};
  double fed = 0.0;
  for (std::size_t z = 0; z < network["V_m3"].size(); ++z) {
    const std::string zone = fmt::format("z{}", z);
    c["zones"][zone]["volume"] = quantity(network["V_m3"][z], "m3");
    const double in = network["Qin_m3_d"][z];
    const double out = network["out_m3_d"][z];
    fed += in;
    if (in > 0.0) {
      c["flows"].push_back({{"from", "feed"}, {"to", zone}, {"flow", quantity(in, "m3/d")}});
    }
    if (out > 0.0) {
      c["flows"].push_back({{"from", zone}, {"to", "out"}, {"flow", quantity(out, "m3/d")}});
    }
  }
  for (const json& link : network["links_from_to_m3_d"]) {
    c["flows"].push_back({{"from", fmt::format("z{}", link[0].get<int>())},
                          {"to", fmt::format("z{}", link[1].get<int>())},
                          {"flow", quantity(link[2], "m3/d")}});
  }
  c["feeds"]["feed"] = {{"flow", quantity(fed, "m3/d")}, {"state", json::object()}};
  c["outlets"] = {"out"};
  c["run"] = {{"kind", "steady"}};
  return c;
}

struct Loaded {
  std::shared_ptr<const WaterNetwork> network;
  double days_per_turnover = 0.0;
};

Loaded load(const json& c, const std::vector<std::string>& pointers) {
  core::FaultList faults;
  const core::UnitReader units;
  const auto document = core::JsonDocument::parse(c.dump(), "case.json", ".", faults);
  const auto the_case = read_case(*document, units, faults);
  EXPECT_TRUE(the_case) << faults.text();
  const auto balance = FlowBalance::solve(*the_case, *document, faults);
  EXPECT_TRUE(balance) << faults.text();
  std::vector<WaterQuantity> quantities;
  for (const std::string& pointer : pointers) {
    quantities.push_back(water_quantity(*the_case, pointer).value());
  }
  double volume = 0.0;
  for (const Zone& zone : the_case->zones) volume += zone.volume.value();
  return {std::make_shared<const WaterNetwork>(*the_case, *balance, quantities),
          volume / the_case->feeds[0].flow.value};
}

class PublishedNetwork : public ::testing::TestWithParam<const char*> {};

TEST_P(PublishedNetwork, ResidenceTimesByTheDay) {  // 1e-10
  const json network = networks()[GetParam()];
  const Loaded loaded = load(case_of(network), {});
  const double days = loaded.days_per_turnover;
  const auto model = network_residence(loaded.network, 0, days, "n", {});
  EXPECT_NEAR(model->mean({}) * days, network["rtd_mean_d"].get<double>(), 1e-10 * days);
  EXPECT_NEAR(model->variance({}) * days * days, network["rtd_variance_d2"].get<double>(),
              1e-10 * days * days);
  for (const auto& [t, e] : network["E_per_d"].items()) {
    EXPECT_NEAR(model->density({}, std::stod(t) / days, {}) / days, e.get<double>(), 1e-10) << t;
  }
  for (const auto& [t, f] : network["F"].items()) {
    EXPECT_NEAR(model->step_response({}, std::stod(t) / days, {}), f.get<double>(), 1e-10) << t;
  }
  for (const auto& [k, left] : network["first_order_unconverted"].items()) {
    EXPECT_NEAR(model->transform({}, std::stod(k) * days, {}), left.get<double>(), 1e-12) << k;
  }
  // RTD-29: mean of E = accessible V/Q; volume-average mean age = (sigma^2 + tau^2)/(2 tau).
  EXPECT_NEAR(network["VoverQ"].get<double>(), days, 1e-10 * days);
  const double tau = model->mean({}) * days;
  const double variance = model->variance({}) * days * days;
  if (network.contains("volume_average_mean_age_d")) {
    EXPECT_NEAR((variance + tau * tau) / (2.0 * tau),
                network["volume_average_mean_age_d"].get<double>(), 1e-10 * tau);
  }
}

TEST_P(PublishedNetwork, Eigenvalues) {  // 1e-10; a double one to the root of it
  const json network = networks()[GetParam()];
  const Loaded loaded = load(case_of(network), {});
  const WaterSystem system = loaded.network->system({}).value();
  const Eigen::VectorXcd found =
      Eigen::EigenSolver<Eigen::MatrixXd>(system.at.transport).eigenvalues();
  std::vector<double> values;
  for (const auto& value : found) {
    EXPECT_NEAR(value.imag(), 0.0, 1e-7);
    values.push_back(value.real());
  }
  std::ranges::sort(values, std::greater<>());
  const double tolerance = std::string(GetParam()) == "two_series_equal" ? 1e-7 : 1e-10;
  for (std::size_t i = 0; i < values.size(); ++i) {
    EXPECT_NEAR(values[i], network["eigenvalues"][i].get<double>(), tolerance);
  }
}

INSTANTIATE_TEST_SUITE_P(Networks, PublishedNetwork,
                         ::testing::Values("single_tank", "two_zone", "two_zone_both_draw",
                                           "three_zone_short_circuit", "three_zone_bypass_outlet",
                                           "chain5_backmix", "two_series_equal"),
                         [](const auto& test) { return std::string(test.param); });

TEST(PublishedGradostat, EigenvaluesOfEqualVesselsInARow) {  // NET-8, 1e-10; D = 1
  const json reference = networks()["gradostat_eigenvalues_unit_D"];
  for (const std::size_t n : {2UL, 3UL, 4UL, 5UL, 10UL}) {
    json network = {{"V_m3", json::array()},
                    {"Qin_m3_d", json::array()},
                    {"out_m3_d", json::array()},
                    {"links_from_to_m3_d", json::array()}};
    for (std::size_t z = 0; z < n; ++z) {
      const bool end = z == 0 || z + 1 == n;
      network["V_m3"].push_back(1.0);
      network["Qin_m3_d"].push_back(end ? 1.0 : 0.0);
      network["out_m3_d"].push_back(end ? 1.0 : 0.0);
      if (z + 1 < n) {
        network["links_from_to_m3_d"].push_back({z, z + 1, 1.0});
        network["links_from_to_m3_d"].push_back({z + 1, z, 1.0});
      }
    }
    const Loaded loaded = load(case_of(network), {});
    const WaterSystem system = loaded.network->system({}).value();
    Eigen::VectorXd found =
        Eigen::SelfAdjointEigenSolver<Eigen::MatrixXd>(system.at.transport).eigenvalues();
    const json& wanted = reference["values"][std::to_string(n)];  // falling; found rises
    for (std::size_t j = 0; j < n; ++j) {
      EXPECT_NEAR(found[static_cast<Eigen::Index>(n - 1 - j)], wanted[j].get<double>(), 1e-10);
    }
  }
}

/// The case as a model of a test with these samples.
UserNetwork bound(const json& c, const TracerTest& test) {
  core::FaultList faults;
  const auto document = core::JsonDocument::parse(c.dump(), "network.json", ".", faults);
  auto user = bind_user_network(*document, "network.json", test, core::UnitReader(), faults);
  EXPECT_TRUE(user) << faults.text();
  return std::move(*user);
}

TEST(PublishedPulse, HalfADayOfDosingIntoOneTank) {  // NET-9, 1e-10
  const json reference = networks()["finite_pulse_single_tank"];
  json c = case_of(networks()["single_tank"]);
  c["zones"]["z0"]["volume"] = {{"value", "3000 m3"}, {"fit", {"100 m3", "9000 m3"}}};
  TracerTest test;
  test.volume = core::Volume(3000.0);
  test.mean_flow = core::FlowRate(150.0);
  const double concentration = reference["feed_conc"];
  test.dose = PulseDose{.mass = concentration * 150.0 * 0.5, .duration = 0.5};
  test.dose_into = "feed";
  test.points.emplace_back();
  test.points[0].at = "outlet";
  const UserNetwork user = bound(c, test);
  for (const auto& [t, wanted] : reference["C"].items()) {
    double value = 0.0;
    const SamplePosition position{.point = 0, .theta = std::stod(t) / 20.0};
    ASSERT_TRUE(user.model->predict(std::vector{3000.0}, std::span(&position, 1),
                                    std::span(&value, 1), {}));
    EXPECT_NEAR(value, wanted.get<double>(), 1e-10 * concentration) << t;
    const auto candidate = make_candidate("one_tank", test);
    ASSERT_TRUE(
        candidate->predict(std::vector{3000.0}, std::span(&position, 1), std::span(&value, 1), {}));
    EXPECT_NEAR(value, wanted.get<double>(), 1e-10 * concentration) << t;
  }
}

/// Every kind of free quantity against central differences of sixth order; a bypass, a share with a
/// rest, an exchange that carries net flow, a ring of exchanges.
TEST(WaterNetwork, DerivativesInEveryKindOfQuantity) {
  const json c = json::parse(R"({
    "stillzone": "case/1", "title": "all kinds", "kinetics": "inert", "temperature": "35 degC",
    "zones": {"a": {"volume": "800 m3"}, "b": {"volume": "1500 m3"}, "c": {"volume": "400 m3"},
              "d": {"volume": "300 m3"}},
    "feeds": {"sludge": {"flow": "150 m3/d", "state": {}}},
    "outlets": ["over", "under"],
    "flows": [
      {"from": "sludge", "to": "a", "share": 0.7},
      {"from": "sludge", "to": "over", "share": 0.1},
      {"from": "sludge", "to": "b"},
      {"between": ["a", "b"], "flow": "90 m3/d"},
      {"between": ["a", "c"], "flow": "60 m3/d"},
      {"between": ["c", "b"], "flow": "45 m3/d"},
      {"between": ["b", "d"], "flow": "20 m3/d"},
      {"from": "b", "to": "under", "flow": "30 m3/d"},
      {"from": "b", "to": "over"}
    ],
    "run": {"kind": "steady"}})");
  const std::vector<std::string> pointers = {
      "/zones/a/volume", "/flows/0/share", "/flows/1/share", "/flows/3/flow",
      "/flows/5/flow",   "/flows/6/flow",  "/flows/7/flow",  "/feeds/sludge/flow"};
  const std::vector<double> p = {800.0, 0.7, 0.1, 90.0, 45.0, 20.0, 30.0, 150.0};
  const Loaded loaded = load(c, pointers);
  EXPECT_TRUE(loaded.network->breaking_continuity().empty());
  std::vector<RtdParameter> parameters(p.size());
  const auto model = network_residence(loaded.network, 0, 20.0, "n", parameters);
  const auto check = [&](auto&& response, const char* what) {
    std::vector<double> gradient(p.size());
    response(p, gradient);
    for (std::size_t j = 0; j < p.size(); ++j) {
      const double h = 1e-2 * p[j];
      const auto at = [&](double steps) {
        std::vector<double> moved = p;
        moved[j] += steps * h;
        return response(moved, {});
      };
      const double slope =
          (45.0 * (at(1) - at(-1)) - 9.0 * (at(2) - at(-2)) + at(3) - at(-3)) / 60.0 / h;
      EXPECT_NEAR(gradient[j] * p[j], slope * p[j], 1e-9) << what << " " << pointers[j];
    }
  };
  using Values = std::vector<double>;
  for (const double theta : {0.1, 0.8}) {
    check([&](const Values& q, std::span<double> g) { return model->step_response(q, theta, g); },
          "F");
    check([&](const Values& q, std::span<double> g) { return model->density(q, theta, g); }, "E");
    check([&](const Values& q, std::span<double> g) { return model->transform(q, theta, g); }, "s");
  }
}

}  // namespace
}  // namespace stillzone::network
