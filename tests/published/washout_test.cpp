// Washout of Monod and Haldane populations in one tank and in networks, through the program's
// commands `run` and `washout` on case files.
// Sources: Monod (1949), Annu. Rev. Microbiol. 3, and the chemostat with decay (closed forms
// beside the tests); Andrews (1968), Biotechnol. Bioeng. 10 (Haldane's law in a chemostat);
// Jaeger, So, Tang and Waltman (1987), J. Math. Biol. 25 (gradostat). Figures of networks without a
// closed form: roots of the steady-state equations by SciPy, residuals below 1e-15.
#include <gtest/gtest.h>

#include <fmt/format.h>
#include <unistd.h>

#include <cmath>
#include <filesystem>
#include <nlohmann/json.hpp>
#include <sstream>
#include <string>
#include <vector>

#include "cli/console.hpp"
#include "cli/program.hpp"

namespace stillzone::testing {
namespace {

using nlohmann::json;

// Monod: mumax, Ks, kd, Y, feed S.
constexpr double kMax = 0.4;
constexpr double kHalf = 0.15;
constexpr double kDecay = 0.02;
constexpr double kFed = 2.0;
/// Net growth at the feed's substrate: what must be washed out.
constexpr double kNet = kMax * kFed / (kHalf + kFed) - kDecay;

class Washout : public ::testing::Test {
 protected:
  void SetUp() override {
    const auto* info = ::testing::UnitTest::GetInstance()->current_test_info();
    folder_ = std::filesystem::temp_directory_path() /
              fmt::format("washout_test_{}_{}", info->name(), ::getpid());
    std::filesystem::create_directories(folder_);
  }
  void TearDown() override { std::filesystem::remove_all(folder_); }

  /// summary.json of a command on a case of this folder.
  json summary(const std::string& command, const std::string& name,
               const std::vector<std::string>& settings = {}) const {
    std::vector<std::string> arguments = {
        command, fmt::format("{}/tests/published/cases/{}.json", STILLZONE_SOURCE_DIR, name),
        "--json", "--out", (folder_ / "out").string()};
    for (const std::string& setting : settings) {
      arguments.push_back("--set");
      arguments.push_back(setting);
    }
    std::ostringstream out;
    std::ostringstream err;
    const int code = cli::run(arguments, out, err, false);
    if (code != cli::kDone) {
      ADD_FAILURE() << "exit " << code << ": " << err.str();
      return {};
    }
    return json::parse(out.str());
  }
  json run(const std::string& name, const std::vector<std::string>& settings = {}) const {
    return summary("run", name, settings);
  }
  json washout(const std::string& name, const std::vector<std::string>& settings = {}) const {
    return summary("washout", name, settings);
  }

 private:
  std::filesystem::path folder_;
};

double in_zone(const json& result, const std::string& zone, const std::string& name) {
  return result["zones"][zone]["state"][name];
}

std::string flow(double value) { return fmt::format("/feeds/feed/flow={} m3/d", value); }
std::string exchange(double value) { return fmt::format("/flows/1/flow={} m3/d", value); }

// ------------------------------------------------------------------------------ one Monod tank

TEST_F(Washout, OneMonodTankIsLostAtItsNetGrowthRate) {  // WASH-1
  const json result = washout("monod_tank");
  const double critical = result["critical_load"].get<double>() * 150.0 / 3000.0;
  EXPECT_NEAR(critical, 0.3520930233, 1e-10);
  EXPECT_NEAR(1.0 / critical, 2.8401585, 1e-7);  // printed to 7 decimals
  EXPECT_NEAR(1.0 / critical, 1.0 / kNet, 1e-10);
  EXPECT_EQ(result["first_to_fail"], "degraders");
  EXPECT_EQ(result["network"]["end"], "washout");
  EXPECT_EQ(result["network"]["state_beyond"], "washed out: degraders");
}

/// Critical retention time [d] of the tank for a feed of 1 / h.
double critical_time(const json& result) {
  return 3000.0 / (150.0 * result["critical_load"].get<double>());
}

TEST_F(Washout, RichFeedNeedsTheShortestRetentionTime) {  // WASH-1, S -> infinity
  // Started near the living state (X = Y D (S_fed - S) / (D + kd) = S_fed / 28 at D = 0.05).
  const double at_h =
      critical_time(washout("monod_tank", {"/feeds/feed/state/S=1e5",
                                           R"(/run/start={"tank": {"S": 0.032, "X": 3571}})"}));
  const double at_2h =
      critical_time(washout("monod_tank", {"/feeds/feed/state/S=5e4",
                                           R"(/run/start={"tank": {"S": 0.032, "X": 1786}})"}));
  EXPECT_NEAR(at_h, 1.0 / (kMax / (1.0 + kHalf * 1e-5) - kDecay), 1e-10);
  // The limit h -> 0 by extrapolation; what is left is of order h^2 = 1e-11.
  EXPECT_NEAR(2.0 * at_h - at_2h, 1.0 / (kMax - kDecay), 1e-10);
  EXPECT_NEAR(2.0 * at_h - at_2h, 2.6315789, 5.1e-8);  // printed digits
}

TEST_F(Washout, MonodTankStandsAtItsClosedForm) {  // WASH-2
  struct Printed {
    double dilution, s, x;
  };
  for (const auto& [d, s, x] :
       {Printed{0.05, 0.0318182, 0.0702922}, Printed{0.2, 0.1833333, 0.0825758},
        Printed{0.35, 1.85, 0.0070946}}) {
    const json result = run("monod_tank", {flow(3000.0 * d)});
    EXPECT_NEAR(in_zone(result, "tank", "S"), s, 5.1e-8) << d;
    EXPECT_NEAR(in_zone(result, "tank", "X"), x, 5.1e-8) << d;
    const double exact = kHalf * (d + kDecay) / (kMax - kDecay - d);
    EXPECT_NEAR(in_zone(result, "tank", "S"), exact, 1e-9) << d;
    EXPECT_NEAR(in_zone(result, "tank", "X"), 0.05 * d * (kFed - exact) / (d + kDecay), 1e-9) << d;
  }
}

// -------------------------------------------------------------------------------- Haldane's fold

double haldane(double s) { return 0.74 * s / (9.28 + s + s * s / 256.0); }
/// Substrate of a point of the curve: without decay and with yield 1, S + X is what is fed.
double substrate(const json& point, double fed) {
  return fed - point["biomass"]["degraders"].get<double>();
}

TEST_F(Washout, HaldaneTankFoldsAtThePeakOfItsGrowth) {  // WASH-3
  const json result = washout("haldane_tank");
  EXPECT_EQ(result["network"]["end"], "fold");
  EXPECT_NEAR(result["critical_load"].get<double>() * 0.4, 0.5359256, 5.1e-8);
  EXPECT_NEAR(result["critical_load"].get<double>() * 0.4,
              0.74 / (1.0 + 2.0 * std::sqrt(9.28 / 256.0)), 1e-9);
  // Both states are stable from mu(150) on.
  EXPECT_NEAR(result["network"]["return_load"].get<double>() * 0.4, 0.4490825, 5.1e-8);
  EXPECT_NEAR(result["network"]["return_load"].get<double>() * 0.4, haldane(150.0), 1e-9);
  const json* fold = nullptr;
  for (const json& point : result["curve"]) {
    if (fold == nullptr || point["load"] > (*fold)["load"]) fold = &point;
  }
  ASSERT_NE(fold, nullptr);
  EXPECT_NEAR(substrate(*fold, 150.0), 48.740948, 1e-6);  // printed digits
}

TEST_F(Washout, HaldaneTankHasALowAndAHighState) {  // WASH-4
  struct Printed {
    double dilution, low, high;
  };
  for (const auto& [d, low, high] :
       {Printed{0.4, 11.528421, 206.071579}, Printed{0.5, 24.034204, 98.845796}}) {
    const json result = washout("haldane_tank", {flow(1000.0 * d), "/feeds/feed/state/S=300",
                                                 R"(/run/start={"tank": {"S": 15, "X": 285}})"});
    const double b = 1.0 - 0.74 / d;  // S^2 / KI + b S + Ks = 0
    const double root = std::sqrt(b * b - 4.0 * 9.28 / 256.0);
    const json& today = result["network"]["today"];
    EXPECT_NEAR(substrate(today, 300.0), low, 5.1e-7) << d;
    EXPECT_NEAR(substrate(today, 300.0), 128.0 * (-b - root), 1e-9) << d;
    EXPECT_TRUE(today["stable"].get<bool>());
    int found = 0;
    for (const json& point : result["curve"]) {
      if (std::abs(point["load"].get<double>() - 1.0) > 1e-12 || point["stable"] == true) continue;
      ++found;
      EXPECT_NEAR(substrate(point, 300.0), high, 5.1e-7) << d;
      EXPECT_NEAR(substrate(point, 300.0), 128.0 * (-b + root), 1e-9) << d;
    }
    EXPECT_EQ(found, 1) << d;
  }
}

// -------------------------------------------------------------------------------------- networks

TEST_F(Washout, StagnantZoneRaisesTheWashoutFlow) {  // WASH-5
  struct Printed {
    double exchange, flow;
  };
  for (const auto& [q, printed] : {Printed{300.0, 2997.064}, Printed{400.0, 1569.284},
                                   Printed{1000.0, 1151.034}, Printed{5000.0, 1071.003}}) {
    const json result = washout("monod_two_zone", {exchange(q)});
    const double critical = 150.0 * result["critical_load"].get<double>();
    EXPECT_NEAR(critical, printed, 5.1e-4) << q;
    const double exact = kNet * (2250.0 + 750.0 * q / (q - kNet * 750.0));
    EXPECT_NEAR(critical / exact, 1.0, 1e-9) << q;
    EXPECT_NEAR(150.0 * result["ideal_critical_load"].get<double>(), 1056.279, 5.1e-4);
  }
}

TEST_F(Washout, BelowTheThresholdTheStagnantZoneIsNeverWashedOut) {  // WASH-5
  EXPECT_NEAR(kNet * 750.0, 264.0698, 5.1e-5);
  const json result = washout("monod_two_zone", {exchange(264.0)});
  EXPECT_TRUE(result["critical_load"].is_null());
  EXPECT_EQ(result["network"]["end"], "none up to the highest load");
}

TEST_F(Washout, DeadVolumeCutOffLowersTheWashoutFlow) {  // WASH-5
  const json result = washout("monod_tank", {"/zones/tank/volume=2250 m3"});
  EXPECT_NEAR(150.0 * result["critical_load"].get<double>(), 792.209, 5.1e-4);
}

TEST_F(Washout, BypassAndDeadVolumeFollowTheirClosedForm) {  // WASH-6
  const json result = washout("monod_bypass");
  EXPECT_NEAR(150.0 * result["critical_load"].get<double>(), kNet * 2250.0 / 0.9, 1e-7);
  EXPECT_NEAR(150.0 * result["critical_load"].get<double>(), 880.2326, 5.1e-5);
  EXPECT_NEAR(result["network_washout_rate_1_d"].get<double>(), 0.06, 1e-12);
  const json steady = run("monod_bypass");
  EXPECT_NEAR(in_zone(steady, "active", "S"), 0.0375, 1e-10);
  EXPECT_NEAR(steady["outlets"]["out"]["state"]["S"].get<double>(), 0.23375, 1e-10);
}

TEST_F(Washout, ShelteredNetworkLosesTreatmentLongBeforeItsBiomass) {  // WASH-7
  struct Printed {
    double flow, s;
  };
  for (const auto& [q, s] : {Printed{150.0, 0.0443056}, Printed{450.0, 0.1894801},
                             Printed{900.0, 1.5703465}, Printed{1200.0, 1.8333163}}) {
    EXPECT_NEAR(in_zone(run("monod_two_zone", {flow(q)}), "mixed", "S"), s, 1e-7) << q;
  }
  // At 900 m3/d one mixed tank of 3000 m3 still holds 0.6.
  EXPECT_NEAR(in_zone(run("monod_tank", {flow(900.0)}), "tank", "S"), 0.6, 1e-9);
}

TEST_F(Washout, ShelteringIsExplainedAndNotSold) {  // WASH-5, WASH-7
  const json result = washout("monod_two_zone");
  std::string warnings;
  for (const json& warning : result["warnings"]) warnings += warning.get<std::string>() + "\n";
  EXPECT_NE(warnings.find("This is no advantage of the poor mixing"), std::string::npos);
  EXPECT_NE(warnings.find("zones that exchange little shelter biomass"), std::string::npos);
  EXPECT_LT(result["network"]["half_treatment_load"].get<double>(),
            result["ideal"]["half_treatment_load"].get<double>());
}

TEST_F(Washout, StagingCanBeatOneMixedTank) {  // WASH-8
  const json series = run("monod_series");
  EXPECT_NEAR(in_zone(series, "second", "S"), 0.00169978, 1e-7);
  EXPECT_NEAR(in_zone(series, "first", "S"), 0.0642857143, 1e-7);
  const json network = run("monod_short_circuit");
  EXPECT_NEAR(network["outlets"]["out"]["state"]["S"].get<double>(), 0.0303755, 1e-7);
  EXPECT_NEAR(in_zone(network, "inlet", "S"), 0.5010402, 1e-7);
  EXPECT_NEAR(in_zone(network, "stagnant", "S"), 0.00038859, 1e-7);
}

// ------------------------------------------------------------------------------------- gradostat

TEST_F(Washout, GradostatHoldsAPopulationAboveItsCriticalGrowth) {  // WASH-9
  struct Printed {
    const char* name;
    double m;
    std::vector<double> s;
  };
  for (const auto& [name, m, s] : {Printed{"gradostat_2", 1.6302616478, {2.0 / 3.0, 1.0 / 3.0}},
                                   Printed{"gradostat_3", 0.9596696584, {0.75, 0.5, 0.25}}}) {
    std::vector<std::string> settings = {fmt::format("/kinetics/set/m={} 1/d", m),
                                         R"(/run/start={"v1": {"S": 0.5}})"};
    const json empty = run(name, settings);
    for (std::size_t v = 0; v < s.size(); ++v) {
      EXPECT_NEAR(in_zone(empty, fmt::format("v{}", v + 1), "S"), s[v], 1e-9) << name;
    }
    const json result = washout(name, settings);
    EXPECT_NEAR(result["groups"]["population"]["invasion_rate_1_d"].get<double>(), 0.0, 1e-9)
        << name;
    EXPECT_EQ(result["network"]["end"], "nothing lives");
  }
}

TEST_F(Washout, InvasionRateOfAnEmptyGradostatIsItsSpectralAbscissa) {  // WASH-9
  const json two = washout("gradostat_2", {R"(/run/start={"v1": {"S": 0.5}})"});
  EXPECT_NEAR(two["groups"]["population"]["invasion_rate_1_d"].get<double>(), 0.5405944463873165,
              1e-9);
  const json three = washout("gradostat_3", {R"(/run/start={"v1": {"S": 0.5}})"});
  EXPECT_NEAR(three["groups"]["population"]["invasion_rate_1_d"].get<double>(), 0.9612032155665778,
              1e-9);
}

TEST_F(Washout, GradostatStandsAtItsSteadyState) {  // WASH-10
  const json two = run("gradostat_2");
  EXPECT_NEAR(in_zone(two, "v1", "S"), 0.3225511, 1e-7);
  EXPECT_NEAR(in_zone(two, "v2", "S"), 0.0908281, 1e-7);
  EXPECT_NEAR(in_zone(two, "v1", "X"), 0.3441156, 1e-7);
  EXPECT_NEAR(in_zone(two, "v2", "X"), 0.2425053, 1e-7);
  const json three = run("gradostat_3");
  EXPECT_NEAR(in_zone(three, "v1", "S"), 0.2407343527, 1e-9);
  EXPECT_NEAR(in_zone(three, "v2", "S"), 0.0482800026, 1e-9);
  EXPECT_NEAR(in_zone(three, "v3", "S"), 0.0123738501, 1e-9);
}

TEST_F(Washout, GroupThatLivesHasInvasionRateZero) {
  const json result = washout("gradostat_2");
  EXPECT_NEAR(result["groups"]["population"]["invasion_rate_1_d"].get<double>(), 0.0, 1e-9);
  EXPECT_NEAR(result["groups"]["population"]["ideal_invasion_rate_1_d"].get<double>(), 0.0, 1e-9);
}

}  // namespace
}  // namespace stillzone::testing
