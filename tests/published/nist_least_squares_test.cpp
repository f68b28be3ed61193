// The 27 nonlinear sets of the NIST/ITL Statistical Reference Datasets through core/least_squares.
// Certified parameters, standard deviations and residual sums: tests/published/data/nist_strd.json
// (source stated there). Derivatives of the models by forward-mode numbers, exact.
#include <ceres/jet.h>
#include <gtest/gtest.h>

#include <cmath>
#include <fstream>
#include <functional>
#include <limits>
#include <nlohmann/json.hpp>

#include "core/least_squares.hpp"

namespace stillzone::core {
namespace {

constexpr int kMostParameters = 9;
using Dual = ceres::Jet<double, kMostParameters>;
using Model = std::function<Dual(const Dual* b, double x, double x2)>;

const double kPi = std::acos(-1.0);

Dual three_exponentials(const Dual* b, double x, double /*x2*/) {
  return b[0] * exp(-b[1] * x) + b[2] * exp(-b[3] * x) + b[4] * exp(-b[5] * x);
}
Dual square(const Dual& x) { return x * x; }
Dual two_peaks(const Dual* b, double x, double /*x2*/) {
  return b[0] * exp(-b[1] * x) + b[2] * exp(-square(x - b[3]) / square(b[4])) +
         b[5] * exp(-square(x - b[6]) / square(b[7]));
}
Dual cubic_ratio(const Dual* b, double x, double /*x2*/) {
  return (b[0] + b[1] * x + b[2] * x * x + b[3] * x * x * x) /
         (1.0 + b[4] * x + b[5] * x * x + b[6] * x * x * x);
}
Dual chwirut(const Dual* b, double x, double /*x2*/) { return exp(-b[0] * x) / (b[1] + b[2] * x); }
Dual misra1a(const Dual* b, double x, double /*x2*/) { return b[0] * (1.0 - exp(-b[1] * x)); }
Dual enso(const Dual* b, double x, double /*x2*/) {
  return b[0] + b[1] * std::cos(2.0 * kPi * x / 12.0) + b[2] * std::sin(2.0 * kPi * x / 12.0) +
         b[4] * cos(2.0 * kPi * x / b[3]) + b[5] * sin(2.0 * kPi * x / b[3]) +
         b[7] * cos(2.0 * kPi * x / b[6]) + b[8] * sin(2.0 * kPi * x / b[6]);
}
/// arctan(z) with its derivative 1 / (1 + z^2).
Dual arctan(const Dual& z) {
  Dual result(std::atan(z.a));
  result.v = z.v / (1.0 + z.a * z.a);
  return result;
}

const std::map<std::string, Model>& models() {
  static const std::map<std::string, Model> all = {
      {"Bennett5",
       [](const Dual* b, double x, double) { return b[0] * pow(b[1] + x, -1.0 / b[2]); }},
      {"BoxBOD", misra1a},
      {"Chwirut1", chwirut},
      {"Chwirut2", chwirut},
      {"DanWood", [](const Dual* b, double x, double) { return b[0] * pow(Dual(x), b[1]); }},
      {"ENSO", enso},
      {"Eckerle4", [](const Dual* b, double x,
                      double) { return b[0] / b[1] * exp(-0.5 * square((x - b[2]) / b[1])); }},
      {"Gauss1", two_peaks},
      {"Gauss2", two_peaks},
      {"Gauss3", two_peaks},
      {"Hahn1", cubic_ratio},
      {"Kirby2",
       [](const Dual* b, double x, double) {
         return (b[0] + b[1] * x + b[2] * x * x) / (1.0 + b[3] * x + b[4] * x * x);
       }},
      {"Lanczos1", three_exponentials},
      {"Lanczos2", three_exponentials},
      {"Lanczos3", three_exponentials},
      {"MGH09", [](const Dual* b, double x,
                   double) { return b[0] * (x * x + x * b[1]) / (x * x + x * b[2] + b[3]); }},
      {"MGH10", [](const Dual* b, double x, double) { return b[0] * exp(b[1] / (x + b[2])); }},
      {"MGH17", [](const Dual* b, double x,
                   double) { return b[0] + b[1] * exp(-x * b[3]) + b[2] * exp(-x * b[4]); }},
      {"Misra1a", misra1a},
      {"Misra1b", [](const Dual* b, double x,
                     double) { return b[0] * (1.0 - pow(1.0 + b[1] * x / 2.0, -2.0)); }},
      {"Misra1c", [](const Dual* b, double x,
                     double) { return b[0] * (1.0 - pow(1.0 + 2.0 * b[1] * x, -0.5)); }},
      {"Misra1d",
       [](const Dual* b, double x, double) { return b[0] * b[1] * x / (1.0 + b[1] * x); }},
      {"Nelson",
       [](const Dual* b, double x, double x2) { return b[0] - b[1] * x * exp(-b[2] * x2); }},
      {"Rat42",
       [](const Dual* b, double x, double) { return b[0] / (1.0 + exp(b[1] - b[2] * x)); }},
      {"Rat43", [](const Dual* b, double x,
                   double) { return b[0] / pow(1.0 + exp(b[1] - b[2] * x), 1.0 / b[3]); }},
      {"Roszman1", [](const Dual* b, double x,
                      double) { return b[0] - b[1] * x - arctan(b[2] / (x - b[3])) / kPi; }},
      {"Thurber", cubic_ratio},
  };
  return all;
}

class NistFunction : public ResidualFunction {
 public:
  NistFunction(const nlohmann::json& set, Model model, bool log_y)
      : model_(std::move(model)), n_parameters_(set["certified"].size()) {
    for (const auto& row : set["data"]) {
      const auto y = row[0].get<double>();
      y_.push_back(log_y ? std::log(y) : y);
      x_.push_back(row[1].get<double>());
      x2_.push_back(row.size() > 2 ? row[2].get<double>() : 0.0);
    }
  }
  [[nodiscard]] std::size_t n_residuals() const override { return y_.size(); }
  [[nodiscard]] std::size_t n_parameters() const override { return n_parameters_; }
  [[nodiscard]] bool evaluate(std::span<const double> parameters, std::span<double> residuals,
                              std::span<double> jacobian) const override {
    std::array<Dual, kMostParameters> b;
    for (std::size_t j = 0; j < n_parameters_; ++j) {
      b[j] = Dual(parameters[j], static_cast<int>(j));
    }
    for (std::size_t i = 0; i < y_.size(); ++i) {
      const Dual value = model_(b.data(), x_[i], x2_[i]);
      residuals[i] = value.a - y_[i];
      if (!std::isfinite(value.a)) return false;
      for (std::size_t j = 0; !jacobian.empty() && j < n_parameters_; ++j) {
        jacobian[i * n_parameters_ + j] = value.v[static_cast<int>(j)];
      }
    }
    return true;
  }

 private:
  Model model_;
  std::size_t n_parameters_;
  std::vector<double> y_, x_, x2_;
};

double matching_digits(double found, double certified) {
  const double error = std::abs(found - certified) / std::abs(certified);
  return error > 0.0 ? -std::log10(error) : 16.0;
}

struct Outcome {
  bool converged = false;
  double parameter_digits = 0.0;  ///< worst parameter
  double deviation_digits = 0.0;  ///< worst standard deviation
  double sum_of_squares = 0.0;
};

Outcome solve(const std::string& name, const nlohmann::json& set, const char* start) {
  const NistFunction function(set, models().at(name), name == "Nelson");
  std::vector<FitParameter> parameters;
  for (const auto& value : set[start]) {
    parameters.push_back({.name = "b",
                          .start = value.get<double>(),
                          .low = -std::numeric_limits<double>::infinity(),
                          .high = std::numeric_limits<double>::infinity()});
  }
  Outcome outcome;
  const auto fit = fit_least_squares(function, parameters, {});
  if (!fit) return outcome;
  outcome.converged = true;
  outcome.sum_of_squares = fit.value().sum_of_squares;
  const FitUncertainty uncertainty = fit_uncertainty(fit.value(), parameters.size());
  outcome.parameter_digits = outcome.deviation_digits = 16.0;
  for (std::size_t j = 0; j < parameters.size(); ++j) {
    outcome.parameter_digits =
        std::min(outcome.parameter_digits,
                 matching_digits(fit.value().parameters[j], set["certified"][j].get<double>()));
    outcome.deviation_digits = std::min(
        outcome.deviation_digits,
        matching_digits(uncertainty.standard_error[j], set["certified_sd"][j].get<double>()));
  }
  return outcome;
}

nlohmann::json nist_sets() {
  std::ifstream file(STILLZONE_SOURCE_DIR "/tests/published/data/nist_strd.json");
  return nlohmann::json::parse(file)["datasets"];
}

TEST(NistStrd, AllSetsReachCertifiedValuesFromStartTwo) {
  const nlohmann::json sets = nist_sets();
  for (const auto& [name, set] : sets.items()) {
    const Outcome outcome = solve(name, set, "start2");
    EXPECT_TRUE(outcome.converged) << name;
    EXPECT_GE(outcome.parameter_digits, 4.5) << name;
    if (name == "Lanczos1") {
      // Certified at 1.43e-25: beyond double precision, so only its smallness is asked for.
      EXPECT_LT(outcome.sum_of_squares, 1e-20);
    } else {
      EXPECT_GE(outcome.deviation_digits, 4.0) << name;
      EXPECT_GE(matching_digits(outcome.sum_of_squares, set["certified_rss"].get<double>()), 6.0)
          << name;
    }
  }
}

TEST(NistStrd, AtLeast26OfStartOneReachThemAndTheRestIsReportedAsFailure) {
  int reached = 0;
  const nlohmann::json sets = nist_sets();
  for (const auto& [name, set] : sets.items()) {
    const Outcome outcome = solve(name, set, "start1");
    if (outcome.converged && outcome.parameter_digits >= 4.5) {
      ++reached;
    } else {
      RecordProperty("not_reached_from_start_1", name);
      EXPECT_FALSE(outcome.converged)
          << name << " was returned as a fit with " << outcome.parameter_digits << " digits";
    }
  }
  EXPECT_GE(reached, 26);
}

}  // namespace
}  // namespace stillzone::core
