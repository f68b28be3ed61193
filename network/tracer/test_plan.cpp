#include "network/tracer/test_plan.hpp"

#include <fmt/format.h>

#include <Eigen/Dense>
#include <algorithm>
#include <cmath>
#include <limits>
#include <random>

#include "core/side_by_side.hpp"
#include "network/tracer/model_fit.hpp"

namespace stillzone::network {
namespace {

using Eigen::Index;

struct Candidate {
  std::unique_ptr<const TracerModel> model;
  std::vector<double> values;
};

std::vector<Candidate> suspected_models(const TracerTest& test, const SuspectedFaults& suspect) {
  const double v = test.volume.value();
  const double exchange = suspect.exchange_flow.value_or(0.3 * test.mean_flow.value());
  std::vector<Candidate> models;
  const auto add = [&](const char* name, std::vector<double> values) {
    models.push_back({make_candidate(name, test), std::move(values)});
  };
  add("one_tank", {v * (1.0 - suspect.dead_fraction)});
  add("tanks_in_series", {v * (1.0 - suspect.dead_fraction), 1.3});
  add("bypass_dead", {1.0 - suspect.dead_fraction, suspect.bypass_fraction});
  add("stagnant_exchange", {1.0 - suspect.stagnant_fraction, exchange});
  return models;
}

/// Dense at first, then wider: half the grid geometric, half even, at least a gap apart.
std::vector<double> candidate_times(const PlanRequest& request) {
  std::vector<double> times;
  constexpr int kHalf = 70;
  for (int i = 0; i <= kHalf; ++i) {
    const double x = static_cast<double>(i) / kHalf;
    times.push_back(request.earliest * std::pow(request.duration / request.earliest, x));
    times.push_back(request.earliest + x * (request.duration - request.earliest));
  }
  std::ranges::sort(times);
  const auto same = std::ranges::unique(
      times, [](double a, double b) { return std::abs(a - b) < 1e-9 * (a + b); });
  times.erase(same.begin(), same.end());
  return times;
}

/// The laboratory's standard deviation at a concentration [g/m3], background included.
double deviation_at(const TracerTest& test, double total, double peak) {
  const SamplingPoint& point = test.points[0];
  const double value = std::max({total, point.detection_limit, 0.01 * peak});
  return std::hypot(point.error_absolute, point.error_relative * value);
}

std::vector<SamplePosition> positions_of(const TracerTest& test, std::span<const double> times) {
  std::vector<SamplePosition> positions;
  for (const double time : times) positions.push_back({.point = 0, .theta = test.turnovers(time)});
  return positions;
}

/// Gradients over deviations, one row per time; rows under the detection limit are 0.
std::vector<double> weighted_gradients(const TracerTest& test, const Candidate& candidate,
                                       std::span<const double> times, double peak) {
  const std::size_t n_model = candidate.values.size();
  const std::size_t p = n_model + (test.recovery_fitted ? 1 : 0);
  const auto positions = positions_of(test, times);
  std::vector<double> values(times.size());
  std::vector<double> gradient(times.size() * n_model);
  (void)candidate.model->predict(candidate.values, positions, values, gradient);
  std::vector<double> rows(times.size() * p, 0.0);
  for (std::size_t i = 0; i < times.size(); ++i) {
    const double total = values[i] + test.background.level;
    if (total < test.points[0].detection_limit) continue;
    const double deviation = deviation_at(test, total, peak);
    for (std::size_t j = 0; j < n_model; ++j) {
      rows[i * p + j] = gradient[i * n_model + j] / deviation;
    }
    if (test.recovery_fitted) rows[i * p + n_model] = values[i] / deviation;
  }
  return rows;
}

using Rows = Eigen::Matrix<double, Eigen::Dynamic, Eigen::Dynamic, Eigen::RowMajor>;

/// Column-scaled information: its ln det and the standard errors it gives.
struct Information {
  double log_det = -HUGE_VAL;
  std::vector<double> standard_errors;
};

Information information_of(const std::vector<double>& rows, std::size_t p) {
  const auto n = static_cast<Index>(rows.size() / p);
  const Eigen::Map<const Rows> j(rows.data(), n, static_cast<Index>(p));
  Information result;
  result.standard_errors.assign(p, std::numeric_limits<double>::infinity());
  const Eigen::VectorXd scale = j.colwise().norm().transpose();
  if (!(scale.minCoeff() > 0.0)) return result;
  const Eigen::MatrixXd scaled = j * scale.cwiseInverse().asDiagonal();
  const Eigen::JacobiSVD<Eigen::MatrixXd> svd(scaled, Eigen::ComputeThinV);
  const Eigen::VectorXd& singular = svd.singularValues();
  if (singular.size() < static_cast<Index>(p) || !(singular.minCoeff() > 1e-7 * singular[0])) {
    return result;
  }
  result.log_det = 2.0 * (singular.array().log().sum() + scale.array().log().sum());
  for (std::size_t a = 0; a < p; ++a) {
    const auto row = static_cast<Index>(a);
    result.standard_errors[a] =
        svd.matrixV().row(row).transpose().cwiseQuotient(singular).norm() / scale[row];
  }
  return result;
}

std::vector<double> spaced(const PlanRequest& request, bool geometric) {
  std::vector<double> times;
  for (std::size_t i = 0; i < request.n_samples; ++i) {
    const double x = static_cast<double>(i) / static_cast<double>(request.n_samples - 1);
    times.push_back(geometric ? request.earliest * std::pow(request.duration / request.earliest, x)
                              : request.earliest + x * (request.duration - request.earliest));
  }
  return times;
}

/// One sample in five, spread geometrically from the earliest to the last time.
std::vector<std::size_t> spread_over(const PlanRequest& request, std::span<const double> times) {
  const std::size_t n = std::max<std::size_t>(2, request.n_samples / 5);
  std::vector<std::size_t> kept;
  for (std::size_t i = 0; i < n; ++i) {
    const double x = static_cast<double>(i) / static_cast<double>(n - 1);
    const double wanted = request.earliest * std::pow(request.duration / request.earliest, x);
    const auto nearest = std::ranges::min_element(
        times, {}, [&](double time) { return std::abs(std::log(time / wanted)); });
    const auto c = static_cast<std::size_t>(nearest - times.begin());
    if (kept.empty() || times[c] - times[kept.back()] >= request.shortest_gap) kept.push_back(c);
  }
  return kept;
}

void choose_dose(const PlanRequest& request, TracerTest& test, TestPlan& plan) {
  auto& pulse = std::get<PulseDose>(test.dose);
  const double volume = test.volume.value() * (1.0 - request.suspect.dead_fraction);
  if (pulse.mass > 0.0) {
    plan.mass_how = "as given";
  } else {
    const double limit = test.points[0].detection_limit;
    const double peak =
        request.peak.value_or(std::max(100.0 * limit, 20.0 * test.background.level));
    pulse.mass = peak * test.volume.value();
    plan.mass_how = request.peak ? "for the peak wanted in the nominal volume"
                                 : "for a peak in the nominal volume of 100 detection limits, or "
                                   "of 20 backgrounds where that is more (common practice, no "
                                   "source)";
  }
  plan.mass = pulse.mass;
  plan.peak = pulse.mass / volume;
}

/// A simulated test: the true model at the plan's times with noise of one seed.
TracerTest simulated(const TracerTest& planned, const Candidate& truth,
                     std::span<const double> times, double peak, std::uint64_t seed) {
  TracerTest test = planned;
  const auto positions = positions_of(test, times);
  std::vector<double> values(times.size());
  (void)truth.model->predict(truth.values, positions, values, {});
  std::mt19937_64 engine(seed);
  std::normal_distribution<double> normal;
  const double limit = test.points[0].detection_limit;
  for (std::size_t i = 0; i < times.size(); ++i) {
    const double total = values[i] + test.background.level;
    const double deviation = deviation_at(test, total, peak);
    const double reading = total + deviation * normal(engine);
    test.points[0].samples.push_back({.time = times[i],
                                      .value = std::max(reading, limit),
                                      .error = deviation,
                                      .censored = reading < limit,
                                      .line = static_cast<int>(i),
                                      .n_averaged = 1});
  }
  return test;
}

/// One kind of fault: the true model at a magnitude, and when a fitted test shows it.
struct FaultKind {
  const char* fault;
  const char* how;
  const char* model;
  std::size_t parameter;  ///< of the model, that tells
  bool against_one_tank;  ///< also better than one tank by a criterion difference of 2
  std::vector<double> (*values)(const PlanRequest& request, double magnitude);
  bool (*excludes_none)(const FittedParameter& parameter, double nominal_volume);
};

std::vector<FaultKind> fault_kinds() {
  constexpr double kNormal = 1.96;
  return {
      {"dead volume", "one_tank is fitted and its volume lies below the nominal one at 95 %",
       "one_tank", 0, false,
       [](const PlanRequest& request, double x) {
         return std::vector{request.test.volume.value() * (1.0 - x)};
       },
       [](const FittedParameter& p, double volume) {
         return p.value + kNormal * p.standard_error < volume;
       }},
      {"bypass", "bypass_dead beats one_tank by 2 in AICc and its bypass is above 0 at 95 %",
       "bypass_dead", 1, true,
       [](const PlanRequest& /*request*/, double x) {
         return std::vector{1.0, x};
       },
       [](const FittedParameter& p, double /*volume*/) {
         return p.value - kNormal * p.standard_error > 0.0;
       }},
      {"stagnant zone",
       "stagnant_exchange beats one_tank by 2 in AICc and its mixed share is below 1 at 95 %",
       "stagnant_exchange", 0, true,
       [](const PlanRequest& request, double x) {
         return std::vector{std::min(1.0 - x, 0.9999), request.suspect.exchange_flow.value_or(
                                                           0.3 * request.test.mean_flow.value())};
       },
       [](const FittedParameter& p, double /*volume*/) {
         return p.value + kNormal * p.standard_error < 1.0;
       }},
  };
}

bool seen(const FaultKind& kind, const TracerTest& test) {
  const auto model = make_candidate(kind.model, test);
  const auto fit = fit_model(test, *model, {.intervals = false});
  if (!fit) return false;
  const FittedParameter& p = fit.value().parameters[kind.parameter];
  if (!std::isfinite(p.standard_error) || !kind.excludes_none(p, test.volume.value())) {
    return false;
  }
  if (!kind.against_one_tank) return true;
  const auto tank = make_candidate("one_tank", test);
  const auto plain = fit_model(test, *tank, {.intervals = false});
  return plain.ok() && fit.value().aicc < plain.value().aicc - 2.0;
}

DetectionCurve detection(const PlanRequest& request, const TracerTest& test, const FaultKind& kind,
                         const TestPlan& plan) {
  DetectionCurve curve{.fault = kind.fault,
                       .how = kind.how,
                       .magnitudes = {0.0, 0.02, 0.05, 0.1, 0.15, 0.2, 0.3, 0.4},
                       .power = {},
                       .smallest = {}};
  const auto draws = static_cast<std::size_t>(request.draws);
  for (std::size_t m = 0; m < curve.magnitudes.size(); ++m) {
    const bool none = m == 0;
    const Candidate truth{
        make_candidate(none ? "one_tank" : kind.model, test),
        none ? std::vector{test.volume.value()} : kind.values(request, curve.magnitudes[m])};
    std::vector<int> hits(draws, 0);
    core::side_by_side(draws, request.threads, [&](std::size_t k) {
      const std::uint64_t seed = request.seed * 1'000'003ULL + m * 10'007ULL + k;
      hits[k] = seen(kind, simulated(test, truth, plan.times, plan.peak, seed)) ? 1 : 0;
    });
    double sum = 0.0;
    for (const int hit : hits) sum += hit;
    curve.power.push_back(sum / static_cast<double>(draws));
    if (!none && curve.power.back() >= 0.8 && !curve.smallest) {
      curve.smallest = curve.magnitudes[m];
    }
    // Larger faults are seen at least as often.
    if (curve.power.back() >= 0.995 && !none) {
      curve.magnitudes.resize(m + 1);
      break;
    }
  }
  return curve;
}

void add_remarks(const TracerTest& test, TestPlan& plan) {
  const auto& pulse = std::get<PulseDose>(test.dose);
  if (!(pulse.duration > 0.0) && test.recovery_fitted) {
    plan.remarks.emplace_back(
        "A dose at once with recovery fitted cannot show a bypass: what leaves at once looks like "
        "tracer lost. Dose over some hours and sample meanwhile, or trust the dose (\"recovery\": "
        "\"as dosed\").");
  }
  for (const PlannedModel& model : plan.models) {
    if (model.in_design) continue;
    plan.remarks.push_back(fmt::format(
        "No choice of sampling times determines all parameters of {} with this dose.", model.name));
  }
  if (test.turnovers(plan.times.back()) < 2.0) {
    plan.remarks.emplace_back(
        "The test ends before two turnovers: mean residence time and slow exchange will rest on "
        "extrapolation.");
  }
}

}  // namespace

TestPlan plan_test(const PlanRequest& request) {
  TracerTest test = request.test;
  TestPlan plan;
  choose_dose(request, test, plan);
  const std::vector<Candidate> candidates = suspected_models(test, request.suspect);
  const std::vector<double> times = candidate_times(request);
  std::vector<std::vector<double>> weighted;
  std::vector<std::size_t> n_parameters;
  for (const Candidate& candidate : candidates) {
    const std::size_t p = candidate.values.size() + (test.recovery_fitted ? 1 : 0);
    auto rows = weighted_gradients(test, candidate, times, plan.peak);
    PlannedModel model;
    model.name = candidate.model->name();
    model.parameters.assign(candidate.model->parameters().begin(),
                            candidate.model->parameters().end());
    model.values = candidate.values;
    if (test.recovery_fitted) {
      model.parameters.push_back(
          {"recovered_fraction", "1", "share of the dose that was seen", 1.0, 0.0, 5.0});
      model.values.push_back(1.0);
    }
    model.in_design = std::isfinite(information_of(rows, p).log_det);
    if (model.in_design) {
      weighted.push_back(std::move(rows));
      n_parameters.push_back(p);
    }
    plan.models.push_back(std::move(model));
  }
  for (const std::size_t c :
       optimal_design(weighted, n_parameters, times, spread_over(request, times), request.n_samples,
                      request.shortest_gap)) {
    plan.times.push_back(times[c]);
  }
  for (int i = 0; i <= 200; ++i) plan.grid.push_back(request.duration * i / 200.0);
  for (std::size_t m = 0; m < candidates.size(); ++m) {
    PlannedModel& model = plan.models[m];
    const std::size_t p = model.values.size();
    const auto with = [&](const std::vector<double>& chosen) {
      return information_of(weighted_gradients(test, candidates[m], chosen, plan.peak), p);
    };
    const Information planned = with(plan.times);
    model.standard_errors = planned.standard_errors;
    const auto efficiency = [&](bool geometric) {
      return std::exp((with(spaced(request, geometric)).log_det - planned.log_det) /
                      static_cast<double>(p));
    };
    if (model.in_design) {
      model.efficiency_equal = efficiency(false);
      model.efficiency_geometric = efficiency(true);
    }
    model.curve.resize(plan.grid.size());
    (void)candidates[m].model->predict(candidates[m].values, positions_of(test, plan.grid),
                                       model.curve, {});
  }
  for (const FaultKind& kind : fault_kinds()) {
    plan.detection.push_back(detection(request, test, kind, plan));
  }
  add_remarks(test, plan);
  return plan;
}

}  // namespace stillzone::network
