// Fits of a lithium test on a digester with a stagnant zone: check values FIT-10 to FIT-16.
// Data (data/two_region_lithium.csv): synthetic, mixed share 0.75, exchange 45 m3/d, 24 kg into
// 3000 m3 at 150 m3/d, normal error 0.10 g/m3. Results (data/two_region_lithium_fits.json): R 4.2.2
// nls, profile intervals by MASS.
#include <boost/math/distributions/fisher_f.hpp>
#include <fstream>

#include "network/tracer/model_fit.hpp"
#include "tests/tracer_support.hpp"

namespace stillzone::network {
namespace {

using nlohmann::json;
const std::string kFolder = STILLZONE_SOURCE_DIR "/tests/published/data";

json results() {
  std::ifstream file(kFolder + "/two_region_lithium_fits.json");
  return json::parse(file);
}

json lithium_test(const std::string& recovery) {
  return {{"stillzone", "test/1"},
          {"volume", "3000 m3"},
          {"flow", "150 m3/d"},
          {"dose", {{"tracer", "lithium"}, {"mass", "24 kg"}, {"at", "0 d"}}},
          {"recovery", recovery},
          {"samples",
           {{{"at", "outlet"},
             {"csv", "two_region_lithium.csv"},
             {"time", {{"column", "t_d"}, {"unit", "d"}}},
             {"value", {{"column", "Li_g_m3"}, {"unit", "g/m3"}}},
             {"error", "0.10 g/m3"}}}}};
}

ModelFit fitted(const TracerTest& test, const std::string& name) {
  const auto model = make_candidate(name, test);
  auto fit = fit_model(test, *model, {});
  EXPECT_TRUE(fit.ok());
  return fit.value();
}

/// Relative to the value.
void expect_near(double found, double wanted, double tolerance, const std::string& what) {
  EXPECT_NEAR(found, wanted, tolerance * std::abs(wanted)) << what;
}

/// Unweighted residual sum of squares [(g/m3)^2].
double plain_squares(const ModelFit& fit) { return fit.sum_of_squares * 0.01; }

TEST(LithiumTest, MixedShareAndExchangeWithKnownDose) {  // FIT-10, 1e-5
  const json wanted = results()["fit_m_q"];
  const auto test = testing::read_test(lithium_test("as dosed"), kFolder);
  ASSERT_TRUE(test.has_value());
  const ModelFit fit = fitted(*test, "stagnant_exchange");
  ASSERT_EQ(fit.parameters.size(), 2U);
  expect_near(fit.parameters[0].value, wanted["estimate"]["mf"], 1e-5, "m");
  expect_near(fit.parameters[1].value, wanted["estimate"]["qx"], 1e-5, "q");
  expect_near(fit.parameters[0].standard_error, wanted["std_error"]["mf"], 1e-5, "SE of m");
  expect_near(fit.parameters[1].standard_error, wanted["std_error"]["qx"], 1e-5, "SE of q");
  expect_near(fit.correlation[1], wanted["cor"][0][1], 1e-5, "correlation");
  expect_near(fit.covariance[1], wanted["cov"][0][1], 1e-5, "covariance");
  expect_near(0.1 * fit.residual_deviation, wanted["sigma"], 1e-5, "sigma");
  EXPECT_EQ(fit.degrees_of_freedom, 22);
}

TEST(LithiumTest, ProfileIntervals) {  // FIT-11, 1e-3
  const json wanted = results()["fit_m_q"];
  const auto test = testing::read_test(lithium_test("as dosed"), kFolder);
  ASSERT_TRUE(test.has_value());
  const ModelFit fit = fitted(*test, "stagnant_exchange");
  const char* const names[] = {"mf", "qx"};
  for (std::size_t j = 0; j < 2; ++j) {
    ASSERT_TRUE(fit.parameters[j].low && fit.parameters[j].high);
    expect_near(*fit.parameters[j].low, wanted["profile95_low"][names[j]], 1e-3, names[j]);
    expect_near(*fit.parameters[j].high, wanted["profile95_high"][names[j]], 1e-3, names[j]);
    EXPECT_TRUE(fit.parameters[j].identified);
  }
}

TEST(LithiumTest, DoseFittedToo) {  // FIT-12, 1e-5
  const json wanted = results()["fit_M_m_q"];
  const auto test = testing::read_test(lithium_test("fitted"), kFolder);
  ASSERT_TRUE(test.has_value());
  const ModelFit fit = fitted(*test, "stagnant_exchange");
  ASSERT_EQ(fit.parameters.size(), 3U);
  expect_near(24000.0 * fit.recovered_fraction(), wanted["estimate"]["MM"], 1e-5, "M");
  expect_near(fit.parameters[0].value, wanted["estimate"]["mf"], 1e-5, "m");
  expect_near(fit.parameters[1].value, wanted["estimate"]["qx"], 1e-5, "q");
  expect_near(24000.0 * fit.parameters[2].standard_error, wanted["std_error"]["MM"], 1e-5, "SE M");
  expect_near(fit.parameters[0].standard_error, wanted["std_error"]["mf"], 1e-5, "SE m");
  expect_near(fit.parameters[1].standard_error, wanted["std_error"]["qx"], 1e-5, "SE q");
  expect_near(plain_squares(fit), wanted["rss"], 1e-5, "RSS");
  expect_near(fit.aicc, wanted["IC"]["AICc"], 1e-3, "AICc");
  expect_near(24000.0 * *fit.parameters[2].low, wanted["profile95_low"]["MM"], 1e-3, "low");
  expect_near(24000.0 * *fit.parameters[2].high, wanted["profile95_high"]["MM"], 1e-3, "high");
}

TEST(LithiumTest, OneTankAsTheRival) {  // FIT-13 and FIT-14, 1e-5
  const json wanted = results();
  const auto known = testing::read_test(lithium_test("as dosed"), kFolder);
  ASSERT_TRUE(known.has_value());
  const ModelFit volume = fitted(*known, "one_tank");
  expect_near(volume.parameters[0].value, wanted["rival_single_tank_V"]["estimate"]["Va"], 1e-5,
              "V");
  expect_near(plain_squares(volume), wanted["rival_single_tank_V"]["rss"], 1e-5, "RSS");
  const auto free = testing::read_test(lithium_test("fitted"), kFolder);
  ASSERT_TRUE(free.has_value());
  const ModelFit both = fitted(*free, "one_tank");
  const json& rival = wanted["rival_single_tank_M_V"];
  expect_near(24000.0 * both.recovered_fraction(), rival["estimate"]["MM"], 1e-5, "M");
  expect_near(both.parameters[0].value, rival["estimate"]["Va"], 1e-5, "V");
  expect_near(plain_squares(both), rival["rss"], 1e-5, "RSS");
}

TEST(LithiumTest, StagnantZoneIsBetterThanOneTankByEveryMeasure) {  // FIT-15, 1e-3
  const json wanted = results();
  const auto known = testing::read_test(lithium_test("as dosed"), kFolder);
  const auto free = testing::read_test(lithium_test("fitted"), kFolder);
  ASSERT_TRUE(known && free);
  expect_near(fitted(*known, "stagnant_exchange").aicc, -37.464, 1e-3, "AICc, dose known");
  const ModelFit one = fitted(*free, "one_tank");
  expect_near(one.aicc, 8.603, 1e-3, "AICc, one tank");
  const ModelFit two = fitted(*free, "stagnant_exchange");
  const double f = (one.sum_of_squares - two.sum_of_squares) /
                   (two.sum_of_squares / static_cast<double>(two.degrees_of_freedom));
  expect_near(f, wanted["F_test_G2_vs_F3"]["F"], 1e-3, "F");
  const boost::math::fisher_f law(1.0, static_cast<double>(two.degrees_of_freedom));
  expect_near(boost::math::cdf(boost::math::complement(law, f)), wanted["F_test_G2_vs_F3"]["p"],
              1e-3, "p");
}

TEST(LithiumTest, SixDaysOfSamplesDoNotIdentifyTheExchange) {  // FIT-16, 1e-3
  auto test = testing::read_test(lithium_test("fitted"), kFolder);
  ASSERT_TRUE(test.has_value());
  std::erase_if(test->points[0].samples, [](const TracerSample& s) { return s.time > 6.0; });
  const ModelFit fit = fitted(*test, "stagnant_exchange");
  expect_near(24000.0 * fit.recovered_fraction(), 23521.5, 1e-3, "M");
  expect_near(fit.parameters[0].value, 0.73162, 1e-3, "m");
  expect_near(fit.parameters[1].value, 44.900, 1e-3, "q");
  expect_near(24000.0 * fit.parameters[2].standard_error, 4354.5, 1e-3, "SE M");
  expect_near(fit.parameters[0].standard_error, 0.13113, 1e-3, "SE m");
  expect_near(fit.parameters[1].standard_error, 53.353, 1e-3, "SE q");
  EXPECT_FALSE(fit.parameters[1].identified) << fit.parameters[1].verdict;
}

}  // namespace
}  // namespace stillzone::network
