// Textbook pulse tests: check values RTD-1 to RTD-10, data and printed answers in
// tests/published/data/rtd_textbook.json. Sources (numbers quoted from memory of the books, each
// recomputed independently): Levenspiel (1999), Chemical Reaction Engineering, 3rd ed., Ex. 11.1,
// 11.4, 13.1; Fogler, Elements of Chemical Reaction Engineering, 4th ed., Ex. 13-1 to 13-7;
// Univ. Michigan reaction engineering course page, lecture 13 example 2 and self-test 13.7.
#include "network/tracer/residence_curve.hpp"

#include <gtest/gtest.h>

#include <cmath>
#include <fstream>
#include <nlohmann/json.hpp>

namespace stillzone::network {
namespace {

nlohmann::json textbook(const char* name) {
  std::ifstream file(STILLZONE_SOURCE_DIR "/tests/published/data/rtd_textbook.json");
  return nlohmann::json::parse(file)[name];
}

ResidenceCurve levenspiel(IntegrationRule rule) {
  const auto data = textbook("levenspiel_pulse");
  return {data["t_min"], data["C_g_L"], rule};
}
ResidenceCurve fogler(IntegrationRule rule) {
  const auto data = textbook("fogler_pulse");
  return {data["t_min"], data["C_g_m3"], rule};
}
ResidenceCurve triangle() {
  const auto data = textbook("umich_triangle_pulse");
  return {data["t_s"], data["C_mg_dm3"], IntegrationRule::straight_lines};
}

TEST(LevenspielPulse, AreaMeanAndVarianceByTheEqualStepSum) {  // RTD-1, 1e-12 relative
  for (const auto rule : {IntegrationRule::equal_step_sum, IntegrationRule::trapezoid}) {
    const ResidenceCurve curve = levenspiel(rule);
    EXPECT_NEAR(curve.area(), 100.0, 1e-10);
    EXPECT_NEAR(curve.mean(), 15.0, 1.5e-11);
    EXPECT_NEAR(curve.variance(), 47.5, 4.75e-11);
  }
}

TEST(LevenspielPulse, StraightLinesGiveALargerVarianceAndTheSameMean) {  // the trap of RTD-1
  const ResidenceCurve curve = levenspiel(IntegrationRule::straight_lines);
  EXPECT_NEAR(curve.mean(), 15.0, 1e-11);
  EXPECT_NEAR(curve.variance(), 51.666666666666686, 1e-10);
  EXPECT_NEAR(curve.quantile(0.1), 5.7915619758884995, 1e-12);
  EXPECT_NEAR(curve.quantile(0.5), 14.5, 1e-12);
  EXPECT_NEAR(curve.quantile(0.9), 25.0, 1e-12);
}

TEST(LevenspielPulse, SegregatedFirstOrder) {  // RTD-3: 0.046906, printed 0.0469
  EXPECT_NEAR(levenspiel(IntegrationRule::equal_step_sum).first_order_left(0.307),
              0.046906483372564395, 1e-11);
}

TEST(FoglerPulse, MomentsBySimpson) {  // RTD-4, 1e-6; printed 50.0, 5.15, 6.10
  const ResidenceCurve curve = fogler(IntegrationRule::simpson);
  EXPECT_NEAR(curve.area(), 50.03333333333334, 1e-9);
  EXPECT_NEAR(curve.mean(), 5.155229846768821, 1e-9);
  EXPECT_NEAR(curve.variance(), 6.108481975818031, 1e-9);
}

TEST(FoglerPulse, OtherRulesGiveTheirOwnVariances) {
  EXPECT_NEAR(fogler(IntegrationRule::trapezoid).variance(), 5.951206867484791, 1e-9);
  EXPECT_NEAR(fogler(IntegrationRule::straight_lines).variance(), 6.288611492518928, 1e-9);
}

TEST(FoglerPulse, SegregatedConversion) {  // RTD-6, 1e-4; printed 0.385
  EXPECT_NEAR(1.0 - fogler(IntegrationRule::simpson).first_order_left(0.1), 0.38551430191261027,
              1e-9);
}

TEST(TrianglePulse, CumulativeAndMoments) {  // RTD-8, 1e-12
  const ResidenceCurve curve = triangle();
  EXPECT_NEAR(curve.cumulative_at(15.0), 0.125, 1e-12);
  EXPECT_NEAR(curve.cumulative_at(20.0), 0.5, 1e-12);
  EXPECT_NEAR(curve.cumulative_at(25.0), 0.875, 1e-12);
  EXPECT_NEAR(curve.mean(), 20.0, 2e-11);
  EXPECT_NEAR(curve.variance(), 16.666666666666686, 1e-10);
  EXPECT_NEAR(curve.quantile(0.875), 25.0, 1e-9);
}

TEST(TrianglePulse, SecondOrderBounds) {  // RTD-9, 1e-6; page prints 0.69 for the ODE
  EXPECT_NEAR(1.0 - triangle().second_order_maximum_mixedness(0.12), 0.6903624245985976, 1e-6);
  EXPECT_NEAR(1.0 - triangle().second_order_segregated(0.12), 0.6994498237165039, 1e-6);
}

TEST(ZwieteringExample, SecondOrderBounds) {  // RTD-10, 0.005; printed 0.61 and 0.56
  const auto data = textbook("fogler_zwietering");
  const ResidenceCurve curve(data["t_min"], data["C_mg_dm3"], IntegrationRule::trapezoid);
  EXPECT_NEAR(1.0 - curve.second_order_segregated(0.08), 0.61, 0.005);
  EXPECT_NEAR(1.0 - curve.second_order_maximum_mixedness(0.08), 0.5639, 0.005);
}

TEST(ResidenceCurve, RuleNamesReadBack) {
  for (const auto rule : {IntegrationRule::straight_lines, IntegrationRule::trapezoid,
                          IntegrationRule::equal_step_sum, IntegrationRule::simpson}) {
    EXPECT_EQ(rule_of(rule_name(rule)), rule);
  }
  EXPECT_FALSE(rule_of("midpoint").has_value());
}

}  // namespace
}  // namespace stillzone::network
