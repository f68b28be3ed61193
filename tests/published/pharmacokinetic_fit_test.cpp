// Published concentration curves fitted through the ordinary way of the tool: a test file and a
// case file. Data: R datasets::Indometh (Kwan et al. 1976, J. Pharmacokinet. Biopharm. 4:255) and
// Theoph (Boeckmann, Sheiner and Beal 1994); results by R 4.2.2 stats::nls, in
// data/{indometh,theoph}_fits.json. A body that takes up a dose at once is a tank that exchanges
// with a stagnant one; one that takes it up from the gut is two tanks in a row.
#include <fmt/format.h>

#include <Eigen/Dense>
#include <cmath>
#include <fstream>

#include "network/tracer/model_fit.hpp"
#include "network/tracer/network_model.hpp"
#include "tests/tracer_support.hpp"

namespace stillzone::network {
namespace {

using nlohmann::json;

json data(const std::string& name) {
  std::ifstream file(STILLZONE_SOURCE_DIR "/tests/published/data/" + name);
  return json::parse(file);
}

/// The rows of one subject as a CSV of its own; @return its folder.
std::filesystem::path subject_csv(const std::string& source, int subject, std::size_t time_column,
                                  std::size_t value_column) {
  const auto folder = std::filesystem::temp_directory_path() /
                      fmt::format("stillzone_subject_{}_{}", source, subject);
  std::filesystem::create_directories(folder);
  std::ifstream in(STILLZONE_SOURCE_DIR "/tests/published/data/" + source);
  std::ofstream out(folder / "samples.csv");
  out << "hour,level\n";
  std::string line;
  while (std::getline(in, line)) {
    std::vector<std::string> cells;
    std::stringstream row(line);
    for (std::string cell; std::getline(row, cell, ',');) cells.push_back(cell);
    if (cells[0] != std::to_string(subject)) continue;
    out << cells[time_column] << "," << cells[value_column] << "\n";
  }
  return folder;
}

json test_file(const std::string& volume, const std::string& flow, const std::string& mass) {
  return {{"stillzone", "test/1"},
          {"volume", volume},
          {"flow", flow},
          {"dose", {{"mass", mass}, {"at", "0 h"}}},
          {"recovery", "fitted"},
          {"samples",
           {{{"at", "outlet"},
             {"csv", "samples.csv"},
             {"time", {{"column", "hour"}, {"unit", "h"}}},
             {"value", {{"column", "level"}, {"unit", "mg/L"}}},
             {"error", "0.1 mg/L"}}}}};
}

ModelFit fitted(const TracerTest& test, const json& network) {
  core::FaultList faults;
  const auto document = core::JsonDocument::parse(network.dump(), "network.json", ".", faults);
  const auto user = bind_user_network(*document, "network.json", test, core::UnitReader(), faults);
  EXPECT_TRUE(user) << faults.text();
  auto fit = fit_model(test, *user->model, {});
  EXPECT_TRUE(fit.ok());
  return fit.value();
}

Eigen::MatrixXd covariance_of(const ModelFit& fit) {
  const auto n = static_cast<Eigen::Index>(fit.parameters.size());
  Eigen::MatrixXd covariance(n, n);
  for (Eigen::Index a = 0; a < n; ++a) {
    for (Eigen::Index b = 0; b < n; ++b) {
      covariance(a, b) = fit.covariance[static_cast<std::size_t>(a * n + b)];
    }
  }
  return covariance;
}

void expect_near(double found, double wanted, double tolerance, const std::string& what) {
  EXPECT_NEAR(found, wanted, tolerance * std::abs(wanted)) << what;
}

/// FIT-2 for all six subjects, 1e-5: c0 = M r/V1, ke = Q/V1, k12 = q/V1, k21 = q/V2 with
/// M = 20 mg, Q = 10 L/h given; V1, V2, q, r fitted. Covariances carried over exactly.
TEST(Indometh, MixedAndStagnantTankAsRFitsIt) {
  const json results = data("indometh_fits.json");
  const json network = json::parse(R"({
    "stillzone": "case/1", "title": "mixed and stagnant", "kinetics": "inert",
    "temperature": "37 degC",
    "zones": {"mixed": {"volume": {"value": "10 L", "fit": ["0.5 L", "200 L"]}},
              "still": {"volume": {"value": "20 L", "fit": ["0.5 L", "2000 L"]}}},
    "feeds": {"in": {"flow": "10 L/h", "state": {}}}, "outlets": ["out"],
    "flows": [{"from": "in", "to": "mixed"}, {"from": "mixed", "to": "out"},
              {"between": ["mixed", "still"],
               "flow": {"value": "6 L/h", "fit": ["0.05 L/h", "500 L/h"]}}],
    "run": {"kind": "steady"}})");
  const double mass = 20.0;               // g/m3 times L: mg
  const double flow = 10.0 / 1e3 * 24.0;  // m3/d
  for (int subject = 1; subject <= 6; ++subject) {
    const auto folder = subject_csv("indometh.csv", subject, 1, 2);
    const auto test = testing::read_test(test_file("30 L", "10 L/h", "20 mg"), folder);
    ASSERT_TRUE(test);
    const ModelFit fit = fitted(*test, network);
    const double v1 = fit.parameters[0].value;
    const double v2 = fit.parameters[1].value;
    const double q = fit.parameters[2].value;
    const double r = fit.parameters[3].value;
    const double day = 1.0 / 24.0;  // 1/d to 1/h
    const Eigen::Vector4d found(mass * 1e-3 * r / v1, flow / v1 * day, q / v1 * day, q / v2 * day);
    Eigen::Matrix4d slope = Eigen::Matrix4d::Zero();
    slope(0, 0) = -found[0] / v1;
    slope(0, 3) = found[0] / r;
    slope(1, 0) = -found[1] / v1;
    slope(2, 0) = -found[2] / v1;
    slope(2, 2) = found[2] / q;
    slope(3, 1) = -found[3] / v2;
    slope(3, 2) = found[3] / q;
    const Eigen::Matrix4d covariance = slope * covariance_of(fit) * slope.transpose();
    const json& wanted = results["fits"][fmt::format("subject_{}", subject)]["two_region"];
    const char* const names[] = {"c0", "ke", "k12", "k21"};
    for (int a = 0; a < 4; ++a) {
      const std::string what = fmt::format("subject {} {}", subject, names[a]);
      expect_near(found[a], wanted["estimate"][names[a]], 1e-5, what);
      expect_near(std::sqrt(covariance(a, a)), wanted["std_error"][names[a]], 1e-5, what + " SE");
      for (int b = 0; b < 4; ++b) {
        const auto i = static_cast<std::size_t>(a);
        const auto j = static_cast<std::size_t>(b);
        // Relative to the product of the standard errors.
        EXPECT_NEAR(covariance(a, b), wanted["cov"][i][j].get<double>(),
                    1e-5 * std::sqrt(covariance(a, a) * covariance(b, b)))
            << what << " with " << names[b];
      }
    }
    expect_near(0.1 * fit.residual_deviation, wanted["sigma"], 1e-5, "sigma");
    EXPECT_EQ(fit.degrees_of_freedom, 7);
  }
}

/// FIT-4, subject 1, 1e-5: C = dose ka ke/(cl (ka - ke)) (exp(-ke t) - exp(-ka t)) is two tanks in
/// a row with ka = Q/Vg, ke = Q/V, cl = Q/r, the dose per kg as mass; the bounds keep gut and body
/// apart, which could be swapped otherwise.
TEST(Theoph, UptakeAndOneTankAsRFitsThem) {
  const json wanted = data("theoph_fits.json")["fits"]["subject_1"];
  const json network = json::parse(R"({
    "stillzone": "case/1", "title": "gut and body", "kinetics": "inert", "temperature": "37 degC",
    "zones": {"gut": {"volume": {"value": "0.02 L", "fit": ["0.001 L", "0.1 L"]}},
              "body": {"volume": {"value": "0.5 L", "fit": ["0.2 L", "5 L"]}}},
    "feeds": {"in": {"flow": "0.03 L/h", "state": {}}}, "outlets": ["out"],
    "flows": [{"from": "in", "to": "gut"}, {"from": "gut", "to": "body"},
              {"from": "body", "to": "out"}],
    "run": {"kind": "steady"}})");
  const auto folder = subject_csv("theoph.csv", 1, 3, 4);
  const auto test = testing::read_test(test_file("0.5 L", "0.03 L/h", "4.02 mg"), folder);
  ASSERT_TRUE(test);
  const ModelFit fit = fitted(*test, network);
  const double q = 0.03;  // L/h
  ASSERT_EQ(fit.parameters[0].name, "/zones/body/volume");
  const double v = 1e3 * fit.parameters[0].value;
  const double vg = 1e3 * fit.parameters[1].value;
  const double r = fit.parameters[2].value;
  const Eigen::Vector3d found(std::log(q / v), std::log(q / vg), std::log(q / r));
  Eigen::Matrix3d slope = Eigen::Matrix3d::Zero();
  slope(0, 0) = -1e3 / v;
  slope(1, 1) = -1e3 / vg;
  slope(2, 2) = -1.0 / r;
  const Eigen::Matrix3d covariance = slope * covariance_of(fit) * slope.transpose();
  const char* const names[] = {"lKe", "lKa", "lCl"};
  for (int a = 0; a < 3; ++a) {
    expect_near(found[a], wanted["estimate"][names[a]], 1e-5, names[a]);
    expect_near(std::sqrt(covariance(a, a)), wanted["std_error"][names[a]], 1e-5, names[a]);
  }
  expect_near(0.1 * fit.residual_deviation, wanted["sigma"], 1e-5, "sigma");
}

}  // namespace
}  // namespace stillzone::network
