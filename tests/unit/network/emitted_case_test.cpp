// An emitted case must be what was fitted: its network, read back, has the model's residence times.
#include <fmt/format.h>
#include <gtest/gtest.h>

#include <cmath>

#include "core/units.hpp"
#include "network/tracer/emitted_case.hpp"
#include "network/tracer/network_residence.hpp"
#include "network/tracer/zone_layout.hpp"

namespace stillzone::network {
namespace {

TracerTest digester() {
  TracerTest test;
  test.title = "invented";
  test.volume = core::Volume(3000.0);
  test.mean_flow = core::FlowRate(150.0);
  return test;
}

/// A fit of a candidate at given values, with a covariance of its own.
ModelFit fit_at(const std::string& name, const std::vector<double>& values) {
  const auto model = make_rtd_model(name, core::Volume(3000.0), core::FlowRate(150.0));
  ModelFit fit;
  fit.name = name;
  fit.meaning = std::string(model->meaning());
  const std::size_t n = values.size();
  fit.covariance.assign(n * n, 0.0);
  for (std::size_t j = 0; j < n; ++j) {
    FittedParameter p;
    p.name = model->parameters()[j].name;
    p.value = values[j];
    p.standard_error = 0.02 * std::abs(values[j]);
    p.identified = true;
    fit.covariance[j * n + j] = p.standard_error * p.standard_error;
    fit.parameters.push_back(p);
  }
  return fit;
}

struct ReadBack {
  Case the_case;
  std::unique_ptr<const RtdModel> residence;
};

ReadBack read_back(const std::string& text) {
  core::FaultList faults;
  const core::UnitReader units;
  const auto document = core::JsonDocument::parse(text, "emitted.json", ".", faults);
  EXPECT_TRUE(document) << faults.text();
  auto the_case = read_case(*document, units, faults);
  EXPECT_TRUE(the_case) << faults.text() << text;
  const auto balance = FlowBalance::solve(*the_case, *document, faults);
  EXPECT_TRUE(balance) << faults.text();
  auto network =
      std::make_shared<const WaterNetwork>(*the_case, *balance, std::vector<WaterQuantity>{});
  ReadBack result{.the_case = std::move(*the_case), .residence = nullptr};
  result.residence = network_residence(network, 0, 20.0, "emitted", {});
  return result;
}

struct Emission {
  const char* name;
  std::vector<double> values;
  double variance_lost = 0.0;  ///< [turnovers^2] that the layout is known to add
};

class EmittedCandidate : public ::testing::TestWithParam<Emission> {};

TEST_P(EmittedCandidate, HasTheMeanVarianceAndBypassOfTheModel) {
  const Emission& emission = GetParam();
  const ModelFit fit = fit_at(emission.name, emission.values);
  const auto text = emitted_case(digester(), fit, std::nullopt);
  ASSERT_TRUE(text.ok()) << text.failure().text();
  const ReadBack emitted = read_back(text.value());
  const auto model = make_rtd_model(emission.name, core::Volume(3000.0), core::FlowRate(150.0));
  // Written with eight digits.
  EXPECT_NEAR(emitted.residence->mean({}), model->mean(emission.values), 1e-6);
  EXPECT_NEAR(emitted.residence->variance({}),
              model->variance(emission.values) + emission.variance_lost, 1e-6);
  const auto impulses = model->impulses(emission.values);
  const auto found = emitted.residence->impulses({});
  ASSERT_EQ(found.size(), impulses.size());
  if (!found.empty()) {
    EXPECT_NEAR(found[0].share, impulses[0].share, 1e-7);
  }
}

TEST_P(EmittedCandidate, CarriesTheFitsSpread) {
  const Emission& emission = GetParam();
  const auto text = emitted_case(digester(), fit_at(emission.name, emission.values), std::nullopt);
  ASSERT_TRUE(text.ok());
  const ReadBack emitted = read_back(text.value());
  EXPECT_FALSE(emitted.the_case.free_quantities.empty());
  for (const core::FreeQuantity& quantity : emitted.the_case.free_quantities) {
    ASSERT_TRUE(quantity.spread) << quantity.pointer;
    EXPECT_GT(quantity.spread->a, 0.0);
  }
  EXPECT_EQ(emitted.the_case.joint_spread.has_value(), emitted.the_case.free_quantities.size() > 1);
}

INSTANTIATE_TEST_SUITE_P(
    Candidates, EmittedCandidate,
    ::testing::Values(
        Emission{"one_tank", {2500.0}}, Emission{"tanks_in_series", {2800.0, 2.35}},
        Emission{"tanks_in_series", {2800.0, 1.2}}, Emission{"tanks_in_series", {2800.0, 3.0}},
        Emission{"bypass_dead", {0.7, 0.08}}, Emission{"stagnant_exchange", {0.75, 45.0}},
        Emission{"series_stagnant", {1.6, 0.8, 60.0}},
        Emission{"plug_tank", {2600.0, 0.2}, 0.004 * 2600.0 * 2600.0 / 9e6},
        Emission{"parallel_paths", {2700.0, 0.3, 0.1}}, Emission{"dispersion", {2900.0, 3.2}},
        Emission{"dispersion", {2900.0, 18.0}}),
    [](const auto& test) { return fmt::format("{}_{}", test.param.name, test.index); });

TEST(EmittedCase, VolumesOfMixedAndStillZoneAreFullyAnticorrelated) {
  const auto text =
      emitted_case(digester(), fit_at("stagnant_exchange", {0.75, 45.0}), std::nullopt);
  const ReadBack emitted = read_back(text.value());
  ASSERT_TRUE(emitted.the_case.joint_spread);
  const JointSpread& joint = *emitted.the_case.joint_spread;
  ASSERT_EQ(joint.quantities.size(), 3U);
  EXPECT_EQ(joint.quantities[0], "/zones/core/volume");
  EXPECT_NEAR(joint.correlation[1], -1.0, 1e-9);
  EXPECT_NEAR(joint.correlation[2], 0.0, 1e-9);
  EXPECT_NEAR(emitted.the_case.free_quantities[0].spread->a, 0.02 * 0.75 * 3000.0, 1e-4);
}

TEST(EmittedCase, FewerThanOneTankIsRefused) {
  const auto text =
      emitted_case(digester(), fit_at("tanks_in_series", {2800.0, 0.8}), std::nullopt);
  ASSERT_FALSE(text.ok());
  EXPECT_NE(text.failure().text().find("0.8 tanks in series"), std::string::npos);
}

TEST(EmittedCase, NearlyPlugFlowIsRefused) {
  EXPECT_FALSE(emitted_case(digester(), fit_at("dispersion", {2900.0, 200.0}), std::nullopt).ok());
}

TEST(EmittedCase, TakesAFeedAsItStands) {
  const EmittedFeed feed{.name = "thickened",
                         .block = {{"flow", "140 m3/d"}, {"state", {{"X_c", 40.0}}}}};
  const auto text = emitted_case(digester(), fit_at("one_tank", {2500.0}), feed);
  const ReadBack emitted = read_back(text.value());
  EXPECT_EQ(emitted.the_case.feeds[0].name, "thickened");
  EXPECT_NEAR(emitted.the_case.feeds[0].flow.value, 140.0, 1e-12);
}

}  // namespace
}  // namespace stillzone::network
