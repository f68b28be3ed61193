#include "core/least_squares.hpp"

#include <ceres/ceres.h>
#include <glog/logging.h>

#include <Eigen/Dense>
#include <algorithm>
#include <array>
#include <cmath>
#include <limits>
#include <memory>

namespace stillzone::core {
namespace {

/// Evaluates all residuals once per trial point; the one-residual blocks below read from it.
class SharedEvaluation : public ceres::EvaluationCallback {
 public:
  SharedEvaluation(const ResidualFunction& function, std::vector<double>& parameters)
      : function_(function),
        parameters_(parameters),
        residuals_(function.n_residuals()),
        jacobian_(function.n_residuals() * function.n_parameters()) {}

  void PrepareForEvaluation(bool evaluate_jacobians, bool new_evaluation_point) override {
    if (!new_evaluation_point && valid_ && (has_jacobian_ || !evaluate_jacobians)) return;
    const std::span<double> jacobian =
        evaluate_jacobians ? std::span<double>(jacobian_) : std::span<double>();
    valid_ = function_.evaluate(parameters_, residuals_, jacobian);
    has_jacobian_ = evaluate_jacobians;
    for (const double residual : residuals_) valid_ = valid_ && std::isfinite(residual);
  }

  [[nodiscard]] bool valid() const { return valid_; }
  [[nodiscard]] double residual(std::size_t i) const { return residuals_[i]; }
  [[nodiscard]] double derivative(std::size_t i, std::size_t j) const {
    return jacobian_[i * function_.n_parameters() + j];
  }

 private:
  const ResidualFunction& function_;
  std::vector<double>& parameters_;
  std::vector<double> residuals_;
  std::vector<double> jacobian_;
  bool valid_ = false;
  bool has_jacobian_ = false;
};

/// Residual i, a block of its own so that the loss acts on each residual.
class OneResidual : public ceres::CostFunction {
 public:
  OneResidual(const SharedEvaluation& shared, std::size_t number, std::size_t n_parameters)
      : shared_(shared), number_(number) {
    set_num_residuals(1);
    for (std::size_t j = 0; j < n_parameters; ++j) mutable_parameter_block_sizes()->push_back(1);
  }
  bool Evaluate(double const* const* /*parameters*/, double* residuals,
                double** jacobians) const override {
    if (!shared_.valid()) return false;
    residuals[0] = shared_.residual(number_);
    if (jacobians != nullptr) {
      for (std::size_t j = 0; j < parameter_block_sizes().size(); ++j) {
        if (jacobians[j] != nullptr) jacobians[j][0] = shared_.derivative(number_, j);
      }
    }
    return true;
  }

 private:
  const SharedEvaluation& shared_;
  std::size_t number_;
};

std::unique_ptr<ceres::LossFunction> make_loss(const LeastSquaresOptions& options) {
  switch (options.loss) {
    case LeastSquaresOptions::Loss::huber:
      return std::make_unique<ceres::HuberLoss>(options.loss_scale);
    case LeastSquaresOptions::Loss::soft_l1:
      return std::make_unique<ceres::SoftLOneLoss>(options.loss_scale);
    case LeastSquaresOptions::Loss::squares:
      break;
  }
  return nullptr;
}

// Each start is tried with a bold and a timid first trust region: a bold first step can land on a
// plateau where a parameter has no effect any more, and look converged there.
constexpr std::array kFirstRadii = {1e4, 1e-4};

// How closely each of several starts is followed before the best is polished.
constexpr double kLooseTolerance = 1e-8;
constexpr int kLooseIterations = 40;

ceres::Solver::Options solver_options(const LeastSquaresOptions& options, double first_radius) {
  ceres::Solver::Options solver;
  solver.linear_solver_type = ceres::DENSE_QR;
  solver.logging_type = ceres::SILENT;
  solver.initial_trust_region_radius = first_radius;
  solver.max_num_iterations = options.most_iterations;
  solver.function_tolerance = options.tolerance;
  solver.gradient_tolerance = 1e-16;
  solver.parameter_tolerance = std::max(1e-13, 1e-3 * options.tolerance);
  solver.max_num_consecutive_invalid_steps = 50;
  return solver;
}

struct OneStart {
  bool converged = false;
  double cost = std::numeric_limits<double>::infinity();
  std::vector<double> parameters;
  int iterations = 0;
  std::string ended;
};

OneStart solve_from(const ResidualFunction& function, std::span<const FitParameter> parameters,
                    std::vector<double> start, double first_radius,
                    const LeastSquaresOptions& options) {
  OneStart result;
  result.parameters = std::move(start);
  SharedEvaluation shared(function, result.parameters);
  const auto loss = make_loss(options);
  ceres::Problem::Options problem_options;
  problem_options.evaluation_callback = &shared;
  problem_options.loss_function_ownership = ceres::DO_NOT_TAKE_OWNERSHIP;
  ceres::Problem problem(problem_options);
  std::vector<double*> blocks;
  for (double& value : result.parameters) blocks.push_back(&value);
  for (std::size_t i = 0; i < function.n_residuals(); ++i) {
    problem.AddResidualBlock(new OneResidual(shared, i, blocks.size()), loss.get(), blocks);
  }
  for (std::size_t j = 0; j < parameters.size(); ++j) {
    const FitParameter& parameter = parameters[j];
    double& value = result.parameters[j];
    value = std::clamp(value, parameter.low, parameter.high);
    if (parameter.low >= parameter.high) {
      problem.SetParameterBlockConstant(&value);
      continue;
    }
    if (std::isfinite(parameter.low)) problem.SetParameterLowerBound(&value, 0, parameter.low);
    if (std::isfinite(parameter.high)) problem.SetParameterUpperBound(&value, 0, parameter.high);
  }
  ceres::Solver::Summary summary;
  ceres::Solve(solver_options(options, first_radius), &problem, &summary);
  result.converged = summary.termination_type == ceres::CONVERGENCE;
  result.cost = summary.final_cost;
  result.iterations = static_cast<int>(summary.iterations.size());
  result.ended = summary.message;
  return result;
}

bool is_at_bound(const FitParameter& parameter, double value) {
  const double width = parameter.high - parameter.low;
  const double slack = std::isfinite(width) ? 1e-9 * width : 1e-12 * (1.0 + std::abs(value));
  return value <= parameter.low + slack || value >= parameter.high - slack;
}

/// Doubling the parameter would move the residuals by less than 1e-9 of their norm.
bool has_no_effect(const LeastSquaresFit& fit, std::size_t parameter) {
  const std::size_t p = fit.parameters.size();
  double squares = 0.0;
  for (std::size_t i = 0; i < fit.residuals.size(); ++i) {
    squares += fit.jacobian[i * p + parameter] * fit.jacobian[i * p + parameter];
  }
  return std::sqrt(squares) * std::abs(fit.parameters[parameter]) <
         1e-9 * std::sqrt(fit.sum_of_squares);
}

void fill_fit(const ResidualFunction& function, std::span<const FitParameter> parameters,
              LeastSquaresFit& fit) {
  fit.residuals.resize(function.n_residuals());
  fit.jacobian.resize(function.n_residuals() * function.n_parameters());
  const bool valid = function.evaluate(fit.parameters, fit.residuals, fit.jacobian);
  SZ_REQUIRE(valid, "the solution cannot be evaluated again");
  fit.n_observations = function.n_observations();
  fit.sum_of_squares = 0.0;
  for (const double residual : fit.residuals) fit.sum_of_squares += residual * residual;
  for (std::size_t j = 0; j < parameters.size(); ++j) {
    fit.at_bound.push_back(is_at_bound(parameters[j], fit.parameters[j]));
    fit.without_effect.push_back(!fit.at_bound[j] && has_no_effect(fit, j));
  }
}

}  // namespace

Result<LeastSquaresFit> fit_least_squares(const ResidualFunction& function,
                                          std::span<const FitParameter> parameters,
                                          const LeastSquaresOptions& options) {
  SZ_REQUIRE(parameters.size() == function.n_parameters() && !parameters.empty(),
             "{} parameters for a function of {}", parameters.size(), function.n_parameters());
  // Ceres' own log lines would land on the user's stderr. Set once: fits run side by side.
  [[maybe_unused]] static const bool kQuiet = [] {
    FLAGS_minloglevel = google::FATAL;
    return true;
  }();

  std::vector<std::vector<double>> starts(1);
  for (const FitParameter& parameter : parameters) starts[0].push_back(parameter.start);
  starts.insert(starts.end(), options.more_starts.begin(), options.more_starts.end());

  LeastSquaresOptions each = options;
  const bool several = starts.size() > 1;
  if (several) {
    each.tolerance = std::max(each.tolerance, kLooseTolerance);
    each.most_iterations = std::min(each.most_iterations, kLooseIterations);
  }
  std::vector<OneStart> ends;
  for (const auto& start : starts) {
    for (const double radius : kFirstRadii) {
      if (radius < 1.0 && !options.timid_steps_too) continue;
      ends.push_back(solve_from(function, parameters, start, radius, each));
    }
  }
  std::optional<OneStart> best;
  for (const OneStart& end : ends) {
    if ((end.converged || several) && (!best || end.cost < best->cost)) best = end;
  }
  if (best && several) {
    OneStart polished = solve_from(function, parameters, best->parameters, kFirstRadii[0], options);
    if (polished.cost <= best->cost) best = std::move(polished);
  }
  if (!best || !best->converged) {
    return Failure{.reason = fmt::format("the fit did not converge from any of {} starting points "
                                         "({})",
                                         starts.size(), ends.front().ended),
                   .try_this = "Check the data and the bounds, or start nearer to the solution."};
  }
  LeastSquaresFit fit;
  fit.parameters = best->parameters;
  fit.iterations = best->iterations;
  fit.starts_tried = ends.size();
  fit.ended = best->ended;
  for (const OneStart& end : ends) {
    const double tolerance = 1e-5 * std::abs(best->cost) + 1e-24;
    if (!(end.cost <= best->cost + tolerance)) continue;
    ++fit.starts_agreeing;
    for (std::size_t j = 0; j < end.parameters.size(); ++j) {
      const double size = std::abs(end.parameters[j]) + std::abs(best->parameters[j]);
      if (std::abs(end.parameters[j] - best->parameters[j]) > 0.01 * size) fit.ambiguous = true;
    }
  }
  fill_fit(function, parameters, fit);
  for (std::size_t j = 0; !options.accept_plateau && j < parameters.size(); ++j) {
    if (!fit.without_effect[j]) continue;
    return Failure{.reason = fmt::format("the fit ended on a plateau: at {} = {:g} this parameter "
                                         "has no effect on the residuals any more",
                                         parameters[j].name, fit.parameters[j]),
                   .try_this = "Start nearer to the solution, or bound the parameter."};
  }
  return fit;
}

}  // namespace stillzone::core
