#include <gmock/gmock.h>
#include <gtest/gtest.h>

#include <cmath>
#include <filesystem>
#include <fstream>
#include <sstream>

#include "kinetics/model_audit.hpp"
#include "kinetics/model_matrix.hpp"
#include "tests/unit/kinetics/models_support.hpp"

namespace stillzone::kinetics::test {
namespace {

std::string file_text(const std::filesystem::path& path) {
  std::ostringstream text;
  text << std::ifstream(path).rdbuf();
  return text.str();
}

TEST(BrokenModels, EveryFaultHasItsExactMessage) {
  const std::filesystem::path folder = STILLZONE_SOURCE_DIR "/tests/program/broken/models";
  int n_files = 0;
  for (const auto& entry : std::filesystem::directory_iterator(folder)) {
    if (entry.path().extension() != ".json") continue;
    ++n_files;
    auto expected = entry.path();
    expected.replace_extension(".expected");
    std::string faults;
    const auto model =
        model_from(file_text(entry.path()), faults, entry.path().filename().string());
    EXPECT_FALSE(model.has_value()) << entry.path();
    EXPECT_EQ(faults, file_text(expected)) << entry.path();
    EXPECT_NE(faults, "");
  }
  EXPECT_GE(n_files, 45);
}

TEST(ShippedModels, AllLoad) {
  EXPECT_THAT(shipped_models(), testing::ElementsAre("adm1", "first_order", "inert", "two_step"));
  for (const std::string& name : shipped_models()) {
    EXPECT_EQ(shipped(name).name, name);
    EXPECT_FALSE(shipped(name).caveats.empty());
  }
}

TEST(ModelAudit, FirstOrderClosesCod) {
  EXPECT_LT(audit_model(shipped("first_order")).worst(Balance::cod), ModelAudit::kClosed);
}

// By hand: -42.14 + 1.42 + 116.5 * 0.064 and -268 * 0.064 + 1.42 + 453 * 0.064 kg COD per kg VSS.
TEST(ModelAudit, TwoStepSaysHowMuchCodThePublishedYieldsLoseAndGain) {
  const ModelAudit audit = audit_model(shipped("two_step"));
  EXPECT_NEAR(audit.processes.at(0).closures[0].error, -33.264, 1e-9);
  EXPECT_NEAR(audit.processes.at(1).closures[0].error, 13.26, 1e-9);
}

// Haldane's law of the shipped parameters peaks at sqrt(K_S2 K_I2) = 48.740948 with
// 0.5359256 1/d, and is 0.4490825 at 150 (check value WASH-3; Andrews 1968).
TEST(TwoStep, MethaneFormersFollowHaldanesLaw) {
  const KineticModel model = shipped("two_step");
  const auto at = [&](double s2) {
    return named_value(model, "mu2", inputs_of(model, {.values = {{"S2", s2}}}));
  };
  EXPECT_NEAR(at(48.740948), 0.5359256, 5e-8);
  EXPECT_NEAR(at(150.0), 0.4490825, 5e-8);
}

TEST(TwoStep, NetProductionIsThatOfThePaper) {
  const KineticModel model = shipped("two_step");
  const auto inputs = inputs_of(model, {.values = {{"S1", 2.0},
                                                   {"S2", 10.0},
                                                   {"X1", 0.3},
                                                   {"X2", 0.5},
                                                   {"Z", 70.0},
                                                   {"C", 80.0},
                                                   {"S_gas_co2", 12.0}},
                                        .gas_transfer = 19.8});
  const double mu1 = 1.2 * 2.0 / (2.0 + 7.1);
  const double mu2 = 0.74 * 10.0 / (10.0 + 9.28 + 100.0 / 256.0);
  const double r1 = mu1 * 0.3;
  const double r2 = mu2 * 0.5;
  const double p_co2 = 12.0 * 0.001 * 0.083145 * 308.15;
  const double q_c = 19.8 * (80.0 + 10.0 - 70.0 - 16.0 * p_co2 / 1.01325);
  const auto source = [&](const char* name) {
    return value_of(model, model.program->source[*model.component(name)], inputs);
  };
  EXPECT_NEAR(source("S1"), -42.14 * r1, 1e-12);
  EXPECT_NEAR(source("S2"), 116.5 * r1 - 268.0 * r2, 1e-11);
  EXPECT_NEAR(source("X1"), r1, 1e-14);
  EXPECT_NEAR(source("X2"), r2, 1e-14);
  EXPECT_NEAR(source("C"), 50.6 * r1 + 343.6 * r2 - q_c, 1e-11);
  EXPECT_DOUBLE_EQ(source("Z"), 0.0);
  EXPECT_NEAR(named_value(model, "pH", inputs), -std::log10(6.5e-7 * 20.0 / 60.0), 1e-12);
}

TEST(FirstOrder, HydrolysisFollowsTheTemperatureByTheta) {
  const KineticModel model = shipped("first_order");
  const auto rate = [&](double temperature) {
    return value_of(
        model, model.program->processes[0].rate,
        inputs_of(model, {.values = {{"X_degradable", 2.0}}, .temperature = temperature}));
  };
  EXPECT_NEAR(rate(308.15), 0.4, 1e-15);
  EXPECT_NEAR(rate(298.15), 0.4 * std::pow(1.05, -10.0), 1e-14);
}

TEST(Inert, NothingHappensToTheTracer) {
  const KineticModel model = shipped("inert");
  EXPECT_DOUBLE_EQ(
      value_of(model, model.program->source[0], inputs_of(model, {.values = {{"S_tracer", 3.0}}})),
      0.0);
}

TEST(LoadModel, SetReplacesAParameterInAnyFittingUnit) {
  std::string faults;
  const auto model =
      loaded(R"({"model": "adm1", "set": {"k_m_ac": "0.25 1/h", "Y_ac": 0.04}})", faults);
  ASSERT_TRUE(model) << faults;
  const auto inputs = inputs_of(*model, {});
  EXPECT_NEAR(named_value(*model, "k_m_ac", inputs), 6.0, 1e-12);
  EXPECT_DOUBLE_EQ(named_value(*model, "Y_ac", inputs), 0.04);
  EXPECT_LT(audit_model(*model).worst(Balance::cod), ModelAudit::kClosed);
}

TEST(LoadModel, SetNamesUnknownParametersAndUnitsThatDoNotFit) {
  std::string faults;
  EXPECT_FALSE(
      loaded(R"({"model": "adm1", "set": {"k_m_acc": "7 1/d", "K_S_ac": "7 1/d"}})", faults));
  EXPECT_EQ(faults,
            "case.json /kinetics/set/k_m_acc (line 2): parameter \"k_m_acc\"; the model \"adm1\" "
            "has no parameter of this name. Did you mean \"k_m_ac\"?\n"
            "case.json /kinetics/set/K_S_ac (line 2): \"7 1/d\"; \"1/d\" cannot be converted to "
            "\"kg COD/m3\". Write it like \"0.15 kg COD/m3\".\n");
}

TEST(LoadModel, FreeParametersJoinTheFreeQuantitiesInTheirModelUnit) {
  std::string faults;
  std::vector<core::FreeQuantity> free;
  const auto model = loaded(
      R"({"model": "adm1", "set": {"k_m_ac": {"value": "8 1/d", "fit": ["4 1/d", "0.5 1/h"]},
          "K_S_ac": {"value": "0.15 kg COD/m3", "spread": {"normal": "20 g COD/m3"}}}})",
      faults, &free);
  ASSERT_TRUE(model) << faults;
  ASSERT_EQ(free.size(), 2U);
  EXPECT_EQ(free[0].pointer, "/kinetics/set/k_m_ac");
  EXPECT_NEAR(*free[0].fit_low, 4.0, 1e-12);
  EXPECT_NEAR(*free[0].fit_high, 12.0, 1e-12);
  EXPECT_NEAR(free[1].spread->a, 0.02, 1e-15);
}

TEST(LoadModel, UnknownModelGetsItsNearestName) {
  std::string faults;
  EXPECT_FALSE(loaded(R"("adm_1")", faults));
  EXPECT_EQ(faults,
            "case.json /kinetics (line 2): \"adm_1\"; no shipped model is called so, and there is "
            "no such file beside this one. Did you mean \"adm1\"?\n");
}

TEST(Extends, AddsChangesAndDeletes) {
  std::string faults;
  const auto model = model_from(R"json({
    "stillzone": "model/1", "title": "ADM1 with sulfide inhibition", "extends": "adm1",
    "components": { "S_h2s": { "unit": "kmol/m3", "phase": "dissolved" } },
    "parameters": { "K_I_h2s": "0.003 kmol/m3" },
    "processes": {
      "decay of hydrogen degraders": null,
      "uptake of hydrogen": { "rate": "k_m_h2 * monod(S_h2, K_S_h2) * X_h2 * I_pH_h2 * I_IN * inhibition(S_h2s, K_I_h2s)"
}
}
})json",
                                faults);
  ASSERT_TRUE(model) << faults;
  EXPECT_EQ(model->components.size(), 27U);
  EXPECT_EQ(model->program->processes.size(), 18U);
  EXPECT_LT(audit_model(*model).worst(Balance::cod), ModelAudit::kClosed);
}

TEST(ModelMatrix, ShowsCoefficientsAsWrittenAndAsNumbers) {
  const KineticModel model = shipped("adm1");
  const ModelMatrix matrix = model_matrix(model);
  const MatrixRow& row = matrix.rows.at(10);
  EXPECT_EQ(row.process, "uptake of acetate");
  EXPECT_EQ(row.entries.at(1).written, "Y_ac");
  EXPECT_DOUBLE_EQ(row.entries.at(1).value, 0.05);
  EXPECT_EQ(row.entries.at(3).written, "closes C");
  // By hand: C_ac - Y C_bac - (1 - Y) C_ch4 = 0.0313 * 0.95 - 0.95 * 0.0156
  EXPECT_NEAR(row.entries.at(3).value, 0.95 * (0.0313 - 0.0156), 1e-16);
}

}  // namespace
}  // namespace stillzone::kinetics::test
