// What people who run digesters take for granted, found again in the model. Common practice, no
// source, unless a line names one. More such facts stand beside the parts they test: sawtooth
// particulates, check valves and surface-limited gas transfer in tests/unit/network.
#include <gtest/gtest.h>

#include <Eigen/Dense>
#include <algorithm>
#include <cmath>
#include <filesystem>
#include <fstream>
#include <vector>

#include "core/dae/steady_state.hpp"
#include "network/digester_system.hpp"
#include "network/start_state.hpp"
#include "tests/case_runner.hpp"

namespace stillzone::testing {
namespace {

/// Eigenvalues [1/d] of the differential unknowns once the algebraic ones follow them:
/// J_dd - J_da J_aa^-1 J_ad, from the exact Jacobian.
Eigen::VectorXcd eigenvalues_at(network::DigesterSystem& system, std::span<const double> y) {
  const auto& pattern = system.pattern();
  const auto n = static_cast<Eigen::Index>(pattern.n);
  std::vector<double> values(static_cast<std::size_t>(pattern.n_entries()));
  system.jacobian(y, values);
  Eigen::MatrixXd jacobian = Eigen::MatrixXd::Zero(n, n);
  for (Eigen::Index column = 0; column < n; ++column) {
    const auto c = static_cast<std::size_t>(column);
    for (auto k = pattern.start[c]; k < pattern.start[c + 1]; ++k) {
      jacobian(pattern.row[static_cast<std::size_t>(k)], column) =
          values[static_cast<std::size_t>(k)];
    }
  }
  std::vector<Eigen::Index> differential;
  std::vector<Eigen::Index> algebraic;
  for (Eigen::Index i = 0; i < n; ++i) {
    (system.differential()[static_cast<std::size_t>(i)] != 0 ? differential : algebraic)
        .push_back(i);
  }
  const Eigen::MatrixXd dd = jacobian(differential, differential);
  if (algebraic.empty()) return dd.eigenvalues();
  const Eigen::MatrixXd da = jacobian(differential, algebraic);
  const Eigen::MatrixXd ad = jacobian(algebraic, differential);
  const Eigen::MatrixXd aa = jacobian(algebraic, algebraic);
  return (dd - da * aa.partialPivLu().solve(ad)).eigenvalues();
}

struct TimeScales {
  double fastest = 0.0;  ///< [d]
  double slowest = 0.0;  ///< [d]
};

TimeScales time_scales(const Eigen::VectorXcd& eigenvalues) {
  const Eigen::VectorXd rates = -eigenvalues.real();
  return {.fastest = 1.0 / rates.maxCoeff(), .slowest = 1.0 / rates.minCoeff()};
}

std::vector<double> started(network::DigesterSystem& system, const LoadedCase& loaded) {
  auto state = network::start_state(loaded.the_case, system);
  EXPECT_TRUE(state.ok());
  return std::move(state).value();
}

TEST(TimeScales, OfAnAdm1TankRunFromAFractionOfASecondToWeeks) {
  const auto loaded = load_file(STILLZONE_SOURCE_DIR "/cases/ideal_tank.json");
  ASSERT_NE(loaded, nullptr);
  network::DigesterSystem system(loaded->the_case, loaded->balance,
                                 {.mode = network::Operation::Mode::mean});
  system.enter(0.0);
  std::vector<double> y = started(system, *loaded);
  const auto solver = core::make_klu_solver(system.pattern());
  ASSERT_TRUE(core::find_steady_state(system, *solver, {}, y).ok());
  const TimeScales scales = time_scales(eigenvalues_at(system, y));
  constexpr double kSecond = 1.0 / 86400.0;
  // With the ions in equilibrium the fastest mode left is the uptake of hydrogen, in a fraction of
  // a second; inert solids leave with the retention time of 20 d.
  EXPECT_LT(scales.fastest, kSecond);
  EXPECT_GT(scales.fastest, kSecond / 1000.0);
  EXPECT_GT(scales.slowest, 15.0);
  EXPECT_LT(scales.slowest, 100.0);
}

/// Dissociation of acetic acid written as a process beside hydrolysis. k_AB 1e10 1/M/d and
/// pK 4.76: Rosen and Jeppsson (2006); hydrolysis 0.25 1/d invented; pH held at 7.
constexpr const char* kIonModel = R"model({
  "stillzone": "model/1", "title": "Ions beside hydrolysis",
  "components": {
    "X_solids": { "unit": "kmol/m3", "phase": "particulate" },
    "S_acid": { "unit": "kmol/m3", "phase": "dissolved" },
    "S_ion": { "unit": "kmol/m3", "phase": "dissolved" }
  },
  "parameters": {
    "k_AB": { "value": "1e10 m3/kmol/d" }, "K_a": { "value": "1.7378e-5 kmol/m3" },
    "S_H": { "value": "1e-7 kmol/m3" }, "k_hyd": { "value": "0.25 1/d" }
  },
  "processes": {
    "hydrolysis": { "rate": "k_hyd * X_solids", "stoichiometry": { "X_solids": -1, "S_acid": 1 } },
    "dissociation": { "rate": "k_AB * (K_a * S_acid - S_H * S_ion)",
                     "stoichiometry" : {
  "S_acid" : -1, "S_ion" : 1
}
}
}
})model";

class IonModel : public ::testing::Test {
 protected:
  void SetUp() override {
    const auto* test = ::testing::UnitTest::GetInstance()->current_test_info();
    path_ = std::filesystem::temp_directory_path() / (std::string("stillzone-") + test->name());
    std::ofstream(path_) << kIonModel;
  }
  void TearDown() override { std::filesystem::remove(path_); }
  [[nodiscard]] std::unique_ptr<LoadedCase> tank() const {
    return load_text(R"({"stillzone": "case/1", "title": "ions", "kinetics": ")" + path_.string() +
                     R"(", "temperature": "35 degC", "zones": {"tank": {"volume": "3000 m3"}},
      "feeds": {"f": {"flow": "150 m3/d", "state": {"X_solids": 0.1}}}, "outlets": ["out"],
      "flows": [{"from": "f", "to": "tank"}, {"from": "tank", "to": "out"}],
      "run": {"kind": "dynamic", "start": "seeded", "until": "60 d", "record_every": "1 d"}})");
  }
  std::filesystem::path path_;
};

TEST_F(IonModel, RelaxesInAFractionOfASecondWhileHydrolysisTakesDays) {
  const auto loaded = tank();
  ASSERT_NE(loaded, nullptr);
  network::DigesterSystem system(loaded->the_case, loaded->balance, {});
  system.enter(0.0);
  const TimeScales scales = time_scales(eigenvalues_at(system, started(system, *loaded)));
  EXPECT_NEAR(scales.fastest * 86400.0, 0.494, 0.005);  // s, 1/(k_AB (K_a + S_H))
  EXPECT_NEAR(scales.slowest, 20.0, 1e-6);              // d, V/Q
}

TEST_F(IonModel, IsIntegratedForSixtyDaysByBothMethods) {
  // X' = (0.1 - X)/20 - 0.25 X from 0: X(60) = (0.005/0.3)(1 - e^-18).
  const double wanted = 0.005 / 0.3 * (1.0 - std::exp(-18.0));
  for (const char* method : {"one-step", "multistep"}) {
    auto loaded = tank();
    ASSERT_NE(loaded, nullptr);
    loaded->the_case.run.integrator = method;
    const auto result = run(*loaded);
    EXPECT_NEAR(value_in(result.zones.at(0).state, "X_solids"), wanted, 1e-6 * wanted) << method;
    const double acid = value_in(result.zones.at(0).state, "S_acid");
    const double ion = value_in(result.zones.at(0).state, "S_ion");
    // Off equilibrium by what makes the ions that leave: (ion Q/V) / k_AB, 5e-5 of the whole.
    EXPECT_NEAR(1.7378e-5 * acid, 1e-7 * ion, 1e-4 * 1e-7 * ion) << method;
  }
}

/// Degradable solids [kg COD] inside five zones in a row, fed at one end and drawn from either.
double fresh_feed_inside(const std::string& drawn_from) {
  const auto loaded = load_text(
      R"({"stillzone": "case/1", "title": "row", "kinetics": "first_order", "temperature": "35 degC",
      "zones": {"z1": {"volume": "600 m3"}, "z2": {"volume": "600 m3"}, "z3": {"volume": "600 m3"},
                "z4": {"volume": "600 m3"}, "z5": {"volume": "600 m3"}},
      "feeds": {"f": {"flow": "150 m3/d", "state": {"X_degradable": 30}}}, "outlets": ["out"],
      "flows": [{"from": "f", "to": "z1"}, {"from": ")" +
      drawn_from + R"(", "to": "out"},
        {"between": ["z1", "z2"], "flow": "200 m3/d"}, {"between": ["z2", "z3"], "flow": "200 m3/d"},
        {"between": ["z3", "z4"], "flow": "200 m3/d"}, {"between": ["z4", "z5"], "flow": "200 m3/d"}]})");
  if (loaded == nullptr) return std::nan("");
  double inside = 0.0;
  const auto result = run(*loaded);
  for (const auto& zone : result.zones) inside += 600.0 * value_in(zone.state, "X_degradable");
  return inside;
}

TEST(InletAndOutlet, FarApartKeepMoreFreshFeedInTheTankThanTheIdealTankAndCloseTogetherLess) {
  // Ideal tank: V c = Q c_in V / (Q + k V), k = 0.2 1/d at 35 degC.
  const double ideal = 150.0 * 30.0 * 3000.0 / (150.0 + 0.2 * 3000.0);
  EXPECT_GT(fresh_feed_inside("z5"), 1.05 * ideal);
  EXPECT_LT(fresh_feed_inside("z1"), 0.95 * ideal);
}

}  // namespace
}  // namespace stillzone::testing
