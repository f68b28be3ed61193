// Residence-time candidates against their closed forms: check values RTD-20 to RTD-26 in
// tests/published/data/rtd_analytic.json, computed independently (SciPy, mpmath 40 digits, Talbot
// inversion in mpmath for dispersion) from the laws printed there with their sources.
#include <gtest/gtest.h>

#include <cmath>
#include <fstream>
#include <nlohmann/json.hpp>

#include "network/tracer/rtd_model.hpp"

namespace stillzone::network {
namespace {

// One cubic metre and one cubic metre a day: user units are then the dimensionless ones.
std::unique_ptr<const RtdModel> unit_model(std::string_view name) {
  return make_rtd_model(name, core::Volume(1.0), core::FlowRate(1.0));
}

const nlohmann::json& references() {
  static const nlohmann::json all = [] {
    std::ifstream file(STILLZONE_SOURCE_DIR "/tests/published/data/rtd_analytic.json");
    return nlohmann::json::parse(file);
  }();
  return all;
}

void expect_relative(double found, double wanted, double tolerance, const std::string& what) {
  EXPECT_NEAR(found, wanted, tolerance * std::max(std::abs(wanted), 1e-3)) << what;
}

struct Tolerances {
  double closed = 1e-10;  ///< variance, transform
  double curve = 1e-10;   ///< E, F, t10 - t90
};

void check_case(const RtdModel& model, const std::vector<double>& p, const nlohmann::json& wanted,
                const Tolerances& tolerance) {
  const std::string label = std::string(model.name()) + " " + wanted.dump().substr(0, 40);
  expect_relative(model.variance(p), wanted["variance"].get<double>(), tolerance.closed, label);
  for (const auto& [k, left] : wanted["unconverted"].items()) {
    expect_relative(model.transform(p, std::stod(k), {}), left.get<double>(), tolerance.closed,
                    label + " unconverted " + k);
  }
  const std::pair<const char*, double> shares[] = {{"t10", 0.1}, {"t50", 0.5}, {"t90", 0.9}};
  for (const auto& [key, share] : shares) {
    expect_relative(quantile(model, p, share), wanted[key].get<double>(), tolerance.curve,
                    label + " " + key);
  }
  if (wanted.contains("F")) {
    for (const auto& [theta, f] : wanted["F"].items()) {
      expect_relative(model.step_response(p, std::stod(theta), {}), f.get<double>(),
                      tolerance.curve, label + " F " + theta);
    }
  }
  const char* density = wanted.contains("E") ? "E" : "E_continuous";
  if (wanted.contains(density)) {
    for (const auto& [theta, e] : wanted[density].items()) {
      expect_relative(model.density(p, std::stod(theta), {}), e.get<double>(), tolerance.curve,
                      label + " E " + theta);
    }
  }
}

TEST(RtdCandidates, TanksInSeriesFollowTheGammaLaw) {  // RTD-20, tolerance 1e-10
  const auto model = unit_model("tanks_in_series");
  for (const auto& wanted : references()["tanks_in_series"]["summary"]) {
    check_case(*model, {1.0, wanted["N"].get<double>()}, wanted, {});
  }
}

TEST(RtdCandidates, BypassAndDeadVolumeAsPublished) {  // RTD-21
  const auto model = unit_model("bypass_dead");
  for (const auto& wanted : references()["bypass_dead_tank"]["cases"]) {
    const std::vector<double> p = {wanted["m"].get<double>(), 1.0 - wanted["n"].get<double>()};
    check_case(*model, p, wanted, {});
    const auto impulses = model->impulses(p);
    ASSERT_EQ(impulses.size(), 1U);
    EXPECT_NEAR(impulses[0].share, wanted["delta_at_zero"].get<double>(), 1e-12);
  }
}

TEST(RtdCandidates, StagnantExchangeHasVarianceOnePlusTwiceStillSquaredOverExchange) {  // RTD-22
  const auto model = unit_model("stagnant_exchange");
  for (const auto& wanted : references()["exchange_tank"]["cases"]) {
    // The file's moments carry 1e-14; curves were summed in double, hence 1e-10.
    check_case(*model, {wanted["m"].get<double>(), wanted["beta"].get<double>()}, wanted, {});
  }
}

TEST(RtdCandidates, PlugSectionThenTank) {  // RTD-23
  const auto model = unit_model("plug_tank");
  for (const auto& wanted : references()["plug_plus_tank"]["cases"]) {
    check_case(*model, {1.0, wanted["plug_fraction"].get<double>()}, wanted, {});
  }
}

TEST(RtdCandidates, ClosedDispersionByItsExactTransform) {  // RTD-24: 1e-9 and 1e-7
  const auto model = unit_model("dispersion");
  for (const auto& wanted : references()["dispersion_closed_closed"]["cases"]) {
    check_case(*model, {1.0, wanted["Pe"].get<double>()}, wanted, {.closed = 1e-9, .curve = 1e-7});
  }
}

TEST(RtdCandidates, MorrillIndexOfOneMixedTank) {  // RTD-25
  const auto model = unit_model("one_tank");
  const std::vector<double> p = {1.0};
  EXPECT_NEAR(quantile(*model, p, 0.9) / quantile(*model, p, 0.1), 21.854345326782834, 1e-11);
}

TEST(RtdCandidates, SeriesStagnantIsStagnantExchangeForOneTank) {
  const auto series = unit_model("series_stagnant");
  const auto single = unit_model("stagnant_exchange");
  for (const double theta : {0.05, 0.3, 1.0, 2.5, 6.0}) {
    EXPECT_NEAR(series->step_response(std::vector{1.0, 0.7, 0.1}, theta, {}),
                single->step_response(std::vector{0.7, 0.1}, theta, {}), 1e-11);
    EXPECT_NEAR(series->density(std::vector{1.0, 0.7, 0.1}, theta, {}),
                single->density(std::vector{0.7, 0.1}, theta, {}), 1e-10);
  }
}

TEST(RtdCandidates, SeriesStagnantWithoutStagnationIsTanksInSeries) {
  const auto series = unit_model("series_stagnant");
  const auto tanks = unit_model("tanks_in_series");
  for (const double theta : {0.05, 0.3, 1.0, 2.5, 6.0}) {
    EXPECT_NEAR(series->step_response(std::vector{2.4, 0.999999999, 1.0}, theta, {}),
                tanks->step_response(std::vector{1.0, 2.4}, theta, {}), 1e-8);
  }
}

/// Sixth-order central difference, error ~ h^6.
template <class Function>
double difference(const Function& f, double x, double h) {
  return (45.0 * (f(x + h) - f(x - h)) - 9.0 * (f(x + 2 * h) - f(x - 2 * h)) +
          (f(x + 3 * h) - f(x - 3 * h))) /
         (60.0 * h);
}

TEST(RtdCandidates, DerivativesAreThoseOfTheResponses) {
  for (const std::string& name : rtd_model_names()) {
    const auto model = make_rtd_model(name, core::Volume(3000.0), core::FlowRate(150.0));
    std::vector<double> p;
    for (const RtdParameter& parameter : model->parameters()) p.push_back(parameter.start);
    for (const double theta : {0.2, 0.9, 3.0}) {
      for (std::size_t j = 0; j < p.size(); ++j) {
        const auto at = [&](double value, auto&& response) {
          std::vector<double> moved = p;
          moved[j] = value;
          return response(moved);
        };
        std::vector<double> gradient(p.size());
        const double h = 2e-3 * p[j];
        const auto check = [&](auto&& response, const char* what) {
          response(p, gradient);
          const double slope = difference(
              [&](double x) {
                return at(x, [&](const std::vector<double>& q) { return response(q, {}); });
              },
              p[j], h);
          EXPECT_NEAR(gradient[j] * p[j], slope * p[j], 2e-8) << name << " " << what << " " << j;
        };
        check([&](const auto& q, std::span<double> g) { return model->step_response(q, theta, g); },
              "step");
        check([&](const auto& q, std::span<double> g) { return model->density(q, theta, g); },
              "density");
        check([&](const auto& q, std::span<double> g) { return model->transform(q, theta, g); },
              "transform");
      }
    }
  }
}

TEST(RtdCandidates, StepIsTheIntegralOfTheDensity) {
  for (const std::string& name : rtd_model_names()) {
    const auto model = unit_model(name);
    std::vector<double> p;
    for (const RtdParameter& parameter : model->parameters()) p.push_back(parameter.start);
    for (const double theta : {0.2, 0.9, 3.0}) {
      const auto step = [&](double x) { return model->step_response(p, x, {}); };
      EXPECT_NEAR(difference(step, theta, 2e-3), model->density(p, theta, {}), 1e-8) << name;
    }
    EXPECT_NEAR(model->transform(p, 0.0, {}), 1.0, 1e-12) << name;
  }
}

}  // namespace
}  // namespace stillzone::network
