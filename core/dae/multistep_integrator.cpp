#include <algorithm>
#include <cmath>
#include <exception>
#include <limits>
#include <memory>
#include <string>
#include <vector>

#include "core/dae/evaluation.hpp"
#include "core/dae/fast_vector.hpp"
#include "core/dae/integrators.hpp"
#include "core/dae/segment.hpp"
#include "core/dae/sundials_compat.hpp"
#include "core/require.hpp"

namespace stillzone::core {
namespace {

/// SUNDIALS' default 0.33 lets the step size stick at a tenth of what the error allows (measured).
/// Newton's rest is also what a balance misses: 0.01 left 2e-9 of the COD in smooth runs at 1e-6,
/// 0.001 leaves 3e-10 for an eighth more rate calls and the same steps (measured).
constexpr double kNonlinearCoefficient = 0.001;

/// What a callback saw last when it could not go on.
struct Cause {
  enum class Kind { none, rates_not_finite, jacobian_not_finite, singular };
  Kind kind = Kind::none;
  std::size_t unknown = 0;
  double time = 0.0;
};

/// What the callbacks of IDA work on.
struct Problem {
  DaeSystem* system = nullptr;
  LinearSolver* solver = nullptr;
  std::vector<double> mass;
  std::vector<double> floors;
  std::vector<double> diagonal;
  std::vector<double> jacobian;
  double relative_tolerance = 0.0;
  long rate_calls = 0;
  long jacobian_calls = 0;
  double time = 0.0;  ///< of the last residual
  Cause cause;
  std::exception_ptr defect;
};

constexpr int kTrySmaller = 1;
constexpr int kStop = -1;

/// Runs a callback's body; no exception passes through SUNDIALS' C code.
template <class Body>
int guarded(Problem& problem, Body body) {
  try {
    return body();
  } catch (...) {
    problem.defect = std::current_exception();
    return kStop;
  }
}

/// F = M y' - f(y).
int residual(double t, N_Vector y, N_Vector y_dot, N_Vector r, void* data) {
  auto& problem = *static_cast<Problem*>(data);
  return guarded(problem, [&] {
    const auto out = values_of(r);
    const auto dot = values_of(y_dot);
    ++problem.rate_calls;
    problem.time = t;
    evaluate_rates(*problem.system, values_of(y), out);
    double poison = 0.0;
    for (std::size_t i = 0; i < out.size(); ++i) {
      out[i] = problem.mass[i] * dot[i] - out[i];
      poison += 0.0 * out[i];
    }
    if (std::isfinite(poison)) return 0;
    problem.cause = {Cause::Kind::rates_not_finite, first_not_finite(out).value_or(0), t};
    return kTrySmaller;
  });
}

/// dF/dy + cj dF/dy' = cj M - J: kept as its two parts for LinearSolver::factor.
int jacobian(double t, double cj, N_Vector y, N_Vector /*y_dot*/, N_Vector /*r*/,
             SUNMatrix /*matrix*/, void* data, N_Vector, N_Vector, N_Vector) {
  auto& problem = *static_cast<Problem*>(data);
  return guarded(problem, [&] {
    ++problem.jacobian_calls;
    problem.time = t;
    evaluate_jacobian(*problem.system, values_of(y), problem.jacobian);
    for (std::size_t i = 0; i < problem.mass.size(); ++i) {
      problem.diagonal[i] = cj * problem.mass[i];
    }
    return 0;
  });
}

int quadratures(double /*t*/, N_Vector y, N_Vector /*y_dot*/, N_Vector g, void* data) {
  auto& problem = *static_cast<Problem*>(data);
  return guarded(problem, [&] {
    evaluate_quadratures(*problem.system, values_of(y), values_of(g));
    return 0;
  });
}

/// The scale on which an error of unknown i is measured: 1 / (rtol (|y| + floor)).
int error_weights(N_Vector y, N_Vector weights, void* data) {
  auto& problem = *static_cast<Problem*>(data);
  const auto in = values_of(y);
  const auto out = values_of(weights);
  double poison = 0.0;
  for (std::size_t i = 0; i < in.size(); ++i) {
    out[i] = 1.0 / (problem.relative_tolerance * (std::abs(in[i]) + problem.floors[i]));
    poison += 0.0 * in[i];
  }
  return std::isfinite(poison) ? 0 : kStop;
}

// ---- our linear solver behind SUNDIALS' interfaces. The matrix holds nothing: values and cj are
// in the Problem.
SUNMatrix_ID matrix_id(SUNMatrix /*matrix*/) { return SUNMATRIX_CUSTOM; }
int matrix_zero(SUNMatrix /*matrix*/) { return 0; }
SUNLinearSolver_Type solver_type(SUNLinearSolver /*solver*/) { return SUNLINEARSOLVER_DIRECT; }
SUNLinearSolver_ID solver_id(SUNLinearSolver /*solver*/) { return SUNLINEARSOLVER_CUSTOM; }
int solver_initialize(SUNLinearSolver /*solver*/) { return 0; }

int solver_setup(SUNLinearSolver solver, SUNMatrix /*matrix*/) {
  auto& problem = *static_cast<Problem*>(solver->content);
  return guarded(problem, [&] {
    if (problem.solver->factor(problem.diagonal, problem.jacobian)) return 0;
    problem.cause = {
        all_finite(problem.jacobian) ? Cause::Kind::singular : Cause::Kind::jacobian_not_finite,
        static_cast<std::size_t>(problem.solver->singular_column()), problem.time};
    return kTrySmaller;
  });
}

int solver_solve(SUNLinearSolver solver, SUNMatrix /*matrix*/, N_Vector x, N_Vector b,
                 double /*tolerance*/) {
  auto& problem = *static_cast<Problem*>(solver->content);
  return guarded(problem, [&] {
    if (x != b) std::ranges::copy(values_of(b), values_of(x).begin());
    problem.solver->solve(values_of(x));
    return 0;
  });
}

// ---- owners of SUNDIALS handles
class Context {
 public:
  Context() { SZ_REQUIRE(sundials::create_context(&context_) == 0, "no SUNDIALS context"); }
  ~Context() { SUNContext_Free(&context_); }
  Context(const Context&) = delete;
  Context& operator=(const Context&) = delete;
  [[nodiscard]] SUNContext get() const { return context_; }

 private:
  SUNContext context_ = nullptr;
};

class LinearWrapper {
 public:
  LinearWrapper(Problem& problem, SUNContext context)
      : matrix_(SUNMatNewEmpty(context)), solver_(SUNLinSolNewEmpty(context)) {
    SZ_REQUIRE(matrix_ != nullptr && solver_ != nullptr, "no SUNDIALS matrix");
    matrix_->ops->getid = matrix_id;
    matrix_->ops->zero = matrix_zero;
    solver_->ops->gettype = solver_type;
    solver_->ops->getid = solver_id;
    solver_->ops->initialize = solver_initialize;
    solver_->ops->setup = solver_setup;
    solver_->ops->solve = solver_solve;
    solver_->content = &problem;
  }
  ~LinearWrapper() {
    SUNMatFreeEmpty(matrix_);
    SUNLinSolFreeEmpty(solver_);
  }
  LinearWrapper(const LinearWrapper&) = delete;
  LinearWrapper& operator=(const LinearWrapper&) = delete;
  [[nodiscard]] SUNMatrix matrix() const { return matrix_; }
  [[nodiscard]] SUNLinearSolver solver() const { return solver_; }

 private:
  SUNMatrix matrix_;
  SUNLinearSolver solver_;
};

class IdaMemory {
 public:
  explicit IdaMemory(SUNContext context) : memory_(IDACreate(context)) {
    SZ_REQUIRE(memory_ != nullptr, "no IDAS memory");
  }
  ~IdaMemory() { IDAFree(&memory_); }
  IdaMemory(const IdaMemory&) = delete;
  IdaMemory& operator=(const IdaMemory&) = delete;
  [[nodiscard]] void* get() const { return memory_; }

 private:
  void* memory_;
};

/// Every return code is looked at; a failing set-up call is a defect of ours.
void check(int code, const char* call) { SZ_REQUIRE(code >= 0, "{} returned {}", call, code); }

class MultistepIntegrator final : public Integrator {
 public:
  MultistepIntegrator(DaeSystem& system, LinearSolver& solver, const IntegratorOptions& options);

  Result<Done> integrate(const IntegrationRequest& request, std::span<double> y,
                         std::span<double> q) override;
  const IntegratorCounts& counts() const override { return counts_; }

 private:
  void set_up();
  Result<Done> enter(double t, bool at_switch);
  Result<Done> restart(double t, double end);
  Result<Done> run_segment(const IntegrationRequest& request, RecordTimes& records, double end);
  bool creeps();
  void learn_first_step();
  void record_up_to(RecordTimes& records);
  void add_segment_counts();
  Failure failure(int code) const;
  std::size_t worst_unknown() const;

  DaeSystem& system_;
  LinearSolver& solver_;
  IntegratorOptions options_;
  IntegratorCounts counts_;
  std::size_t n_;
  std::size_t n_quadratures_;
  Problem problem_;
  Context context_;
  IdaMemory ida_;
  LinearWrapper linear_;
  FastVector y_, y_dot_, q_, dense_y_, dense_q_, errors_, weights_;
  LearntSteps learnt_;
  bool initialised_ = false;
  bool has_algebraic_ = false;
  double t_ = 0.0;
  double trouble_since_ = 0.0;
  int n_troubles_ = 0;
  std::size_t solves_before_ = 0;
  std::size_t factorisations_before_ = 0;
};

MultistepIntegrator::MultistepIntegrator(DaeSystem& system, LinearSolver& solver,
                                         const IntegratorOptions& options)
    : system_(system),
      solver_(solver),
      options_(options),
      n_(system.n_unknowns()),
      n_quadratures_(system.n_quadratures()),
      ida_(context_.get()),
      linear_(problem_, context_.get()),
      y_(n_, context_.get()),
      y_dot_(n_, context_.get()),
      q_(std::max<std::size_t>(1, n_quadratures_), context_.get()),
      dense_y_(n_, context_.get()),
      dense_q_(std::max<std::size_t>(1, n_quadratures_), context_.get()),
      errors_(n_, context_.get()),
      weights_(n_, context_.get()) {
  counts_.method = "multistep (IDAS)";
  counts_.reason = "asked for";
  counts_.linear_solver = solver.name();
  problem_.system = &system;
  problem_.solver = &solver;
  problem_.mass.assign(system.differential().begin(), system.differential().end());
  problem_.floors.assign(system.floors().begin(), system.floors().end());
  problem_.diagonal.resize(n_);
  problem_.jacobian.resize(static_cast<std::size_t>(system.pattern().n_entries()));
  problem_.relative_tolerance = options.relative_tolerance;
  has_algebraic_ = std::ranges::find(system.differential(), 0) != system.differential().end();
  std::ranges::fill(q_.values(), 0.0);
  std::ranges::fill(dense_q_.values(), 0.0);
}

void MultistepIntegrator::set_up() {
  void* ida = ida_.get();
  check(sundials::silence(ida), "silence");
  check(IDAInit(ida, residual, t_, y_.get(), y_dot_.get()), "IDAInit");
  check(IDASetUserData(ida, &problem_), "IDASetUserData");
  check(IDAWFtolerances(ida, error_weights), "IDAWFtolerances");
  check(IDASetLinearSolver(ida, linear_.solver(), linear_.matrix()), "IDASetLinearSolver");
  check(IDASetJacFn(ida, jacobian), "IDASetJacFn");
  check(IDASetNonlinConvCoef(ida, kNonlinearCoefficient), "IDASetNonlinConvCoef");
  if (options_.longest_step > 0.0) {
    check(IDASetMaxStep(ida, options_.longest_step), "IDASetMaxStep");
  }
  if (n_quadratures_ > 0) {
    check(IDAQuadInit(ida, quadratures, q_.get()), "IDAQuadInit");
    check(IDASetQuadErrCon(ida, 0), "IDASetQuadErrCon");
  }
  initialised_ = true;
}

Result<Done> MultistepIntegrator::integrate(const IntegrationRequest& request, std::span<double> y,
                                            std::span<double> q) {
  SZ_REQUIRE(y.size() == n_ && q.size() == n_quadratures_, "y {} of {}, q {} of {}", y.size(), n_,
             q.size(), n_quadratures_);
  SZ_REQUIRE(request.until >= request.from, "from {} until {}", request.from, request.until);
  solves_before_ = solver_.n_solves;
  factorisations_before_ = solver_.n_factorisations;
  std::ranges::copy(y, y_.values().begin());
  std::ranges::copy(q, q_.values().begin());
  RecordTimes records(request);
  t_ = request.from;
  auto result = [&]() -> Result<Done> {
    if (auto entered = enter(t_, false); !entered) return entered;
    while (records.due(t_)) records.record(y_.values(), q_.values().first(n_quadratures_));
    while (t_ < request.until) {
      const double end = std::min(system_.next_switch(t_).value_or(request.until), request.until);
      if (auto done = run_segment(request, records, end); !done) return done;
      if (t_ < request.until) {
        if (auto entered = enter(t_, true); !entered) return entered;
      }
    }
    return Done{};
  }();
  std::ranges::copy(y_.values(), y.begin());
  std::ranges::copy(q_.values().first(n_quadratures_), q.begin());
  return result;
}

Result<Done> MultistepIntegrator::enter(double t, bool at_switch) {
  if (at_switch) ++counts_.switches;
  system_.enter(t);
  if (!has_algebraic_) return Done{};
  return system_.make_consistent(y_.values());
}

/// Derivatives from the residual (concentrations are continuous at a switch), 0 for algebraic
/// unknowns; the first step as learnt in intervals of the same kind.
Result<Done> MultistepIntegrator::restart(double t, double end) {
  const auto y_dot = y_dot_.values();
  evaluate_rates(system_, y_.values(), y_dot);
  ++problem_.rate_calls;
  if (const auto i = first_not_finite(y_dot)) {
    return failure_at(system_, *i, t, "the rates are not finite", kIntegrationAdvice);
  }
  const double learnt = learnt_.of(system_.interval_kind());
  double first = learnt > 0.0 ? learnt : options_.first_step;
  if (!(first > 0.0)) {
    // of order 1 at first: a tenth of what an order-4 method would try
    first = 0.1 * first_step_guess(y_.values(), y_dot, problem_.mass, problem_.floors, end - t);
  }
  for (std::size_t i = 0; i < n_; ++i) y_dot[i] *= problem_.mass[i];
  if (initialised_) {
    check(IDAReInit(ida_.get(), t, y_.get(), y_dot_.get()), "IDAReInit");
    if (n_quadratures_ > 0) check(IDAQuadReInit(ida_.get(), q_.get()), "IDAQuadReInit");
  } else {
    set_up();
  }
  check(IDASetInitStep(ida_.get(), std::min(first, end - t)), "IDASetInitStep");
  return Done{};
}

Result<Done> MultistepIntegrator::run_segment(const IntegrationRequest& request,
                                              RecordTimes& records, double end) {
  const double rounding =
      8.0 * std::numeric_limits<double>::epsilon() * (std::abs(t_) + std::abs(end));
  if (end - t_ <= rounding) {  // closer than times can be told apart
    t_ = end;
    while (records.due(t_)) records.record(y_.values(), q_.values().first(n_quadratures_));
    return Done{};
  }
  if (auto restarted = restart(t_, end); !restarted) return restarted;
  check(IDASetStopTime(ida_.get(), end), "IDASetStopTime");
  bool first = true;
  const long steps_before = counts_.steps;
  long steps_here = 0;
  while (t_ < end) {
    if (steps_before + steps_here >= options_.most_steps) {
      add_segment_counts();
      return failure_at(system_, n_, t_,
                        fmt::format("more than {} steps are needed", options_.most_steps),
                        kIntegrationAdvice);
    }
    problem_.cause = Cause{};
    double reached = t_;
    const int code = IDASolve(ida_.get(), end, &reached, y_.get(), y_dot_.get(), IDA_ONE_STEP);
    if (problem_.defect) std::rethrow_exception(problem_.defect);
    if (code < 0 || (problem_.cause.kind != Cause::Kind::none && creeps())) {
      add_segment_counts();
      return failure(code);
    }
    ++steps_here;
    if (first) learn_first_step();
    first = false;
    t_ = code == IDA_TSTOP_RETURN ? end : reached;
    if (t_ < end) record_up_to(records);
    if (request.progress) request.progress(t_);
  }
  record_up_to(records);
  if (n_quadratures_ > 0) {
    double reached = 0.0;
    check(IDAGetQuad(ida_.get(), &reached, q_.get()), "IDAGetQuad");
  }
  while (records.due(t_)) records.record(y_.values(), q_.values().first(n_quadratures_));
  add_segment_counts();
  return Done{};
}

/// Before a wall (rates that are no numbers beyond it) IDA goes on with ever smaller steps: true
/// after many steps with trouble while time hardly moved.
bool MultistepIntegrator::creeps() {
  constexpr int kMostTroubles = 100;
  if (t_ - trouble_since_ > 1e-6 * std::max(std::abs(t_), 1e-3) || t_ < trouble_since_) {
    trouble_since_ = t_;
    n_troubles_ = 0;
  }
  return ++n_troubles_ > kMostTroubles;
}

/// The step that would have just met the tolerance at order 1, from the first accepted step alone:
/// later failures belong to other causes.
void MultistepIntegrator::learn_first_step() {
  double step = 0.0;
  long failures = 0;
  check(IDAGetLastStep(ida_.get(), &step), "IDAGetLastStep");
  check(IDAGetNumErrTestFails(ida_.get(), &failures), "IDAGetNumErrTestFails");
  check(IDAGetEstLocalErrors(ida_.get(), errors_.get()), "IDAGetEstLocalErrors");
  check(IDAGetErrWeights(ida_.get(), weights_.get()), "IDAGetErrWeights");
  const double error = std::max(1e-4, N_VWrmsNorm(errors_.get(), weights_.get()));
  double growth = std::clamp(std::sqrt(0.25 / error), 0.5, 8.0);
  if (failures > 0) growth = std::min(growth, 1.0);
  learnt_.learn(system_.interval_kind(), step * growth);
}

/// Records strictly before the time reached.
void MultistepIntegrator::record_up_to(RecordTimes& records) {
  while (records.due(t_) && records.time() < t_) {
    check(IDAGetDky(ida_.get(), records.time(), 0, dense_y_.get()), "IDAGetDky");
    if (n_quadratures_ > 0) {
      check(IDAGetQuadDky(ida_.get(), records.time(), 0, dense_q_.get()), "IDAGetQuadDky");
    }
    records.record(dense_y_.values(), dense_q_.values().first(n_quadratures_));
  }
}

void MultistepIntegrator::add_segment_counts() {
  long steps = 0;
  long error_failures = 0;
  long newton_failures = 0;
  check(IDAGetNumSteps(ida_.get(), &steps), "IDAGetNumSteps");
  check(IDAGetNumErrTestFails(ida_.get(), &error_failures), "IDAGetNumErrTestFails");
  check(IDAGetNumNonlinSolvConvFails(ida_.get(), &newton_failures), "IDAGetNumNonlinSolvConvFails");
  counts_.steps += steps;
  counts_.rejected_steps += error_failures + newton_failures;
  counts_.rate_calls = problem_.rate_calls;
  counts_.jacobian_calls = problem_.jacobian_calls;
  counts_.solves += static_cast<long>(solver_.n_solves - solves_before_);
  counts_.factorisations += static_cast<long>(solver_.n_factorisations - factorisations_before_);
  solves_before_ = solver_.n_solves;
  factorisations_before_ = solver_.n_factorisations;
}

std::size_t MultistepIntegrator::worst_unknown() const {
  if (IDAGetEstLocalErrors(ida_.get(), errors_.get()) < 0) return 0;
  if (IDAGetErrWeights(ida_.get(), weights_.get()) < 0) return 0;
  const auto errors = errors_.values();
  const auto weights = weights_.values();
  std::size_t worst = 0;
  for (std::size_t i = 1; i < n_; ++i) {
    if (std::abs(errors[i] * weights[i]) > std::abs(errors[worst] * weights[worst])) worst = i;
  }
  return worst;
}

Failure MultistepIntegrator::failure(int code) const {
  double step = 0.0;
  static_cast<void>(IDAGetCurrentStep(ida_.get(), &step));
  std::string reason;
  std::size_t at = problem_.cause.unknown;
  switch (problem_.cause.kind) {
    case Cause::Kind::rates_not_finite:
      reason = fmt::format("the rates are not finite, down to a step of {:.3g} d", step);
      break;
    case Cause::Kind::jacobian_not_finite:
      reason = fmt::format("the Jacobian is not finite, down to a step of {:.3g} d", step);
      break;
    case Cause::Kind::singular:
      reason = fmt::format("the matrix of the step is singular, down to a step of {:.3g} d", step);
      break;
    case Cause::Kind::none:
      at = worst_unknown();
      reason = fmt::format("a step of {:.3g} d still misses the tolerance {:g} (IDAS code {})",
                           step, options_.relative_tolerance, code);
      break;
  }
  Failure result = failure_at(system_, at, t_, std::move(reason), kIntegrationAdvice);
  result.got_done = fmt::format("{} steps were done.", counts_.steps);
  return result;
}

}  // namespace

std::unique_ptr<Integrator> make_multistep_integrator(DaeSystem& system, LinearSolver& solver,
                                                      const IntegratorOptions& options) {
  return std::make_unique<MultistepIntegrator>(system, solver, options);
}

}  // namespace stillzone::core
