#include "core/dae/integrator.hpp"

#include <gtest/gtest.h>

#include <Eigen/Dense>
#include <cmath>
#include <unsupported/Eigen/MatrixFunctions>

#include "tests/unit/core/dae_systems_support.hpp"

namespace stillzone::core {
namespace {

using test::FunctionSystem;
using test::linear_system;

struct Outcome {
  std::vector<double> y, q;
  IntegratorCounts counts;
};

Outcome integrate(DaeSystem& system, IntegratorKind kind, double rtol, double until,
                  std::vector<double> y) {
  auto solver = make_klu_solver(system.pattern());
  auto integrator = make_integrator(kind, system, *solver, {.relative_tolerance = rtol});
  Outcome outcome{std::move(y), std::vector<double>(system.n_quadratures(), 0.0), {}};
  const auto done = integrator->integrate(
      {.from = 0.0, .until = until, .record_at = {}, .record = {}, .progress = {}}, outcome.y,
      outcome.q);
  EXPECT_TRUE(done.ok()) << (done.ok() ? "" : done.failure().text());
  outcome.counts = integrator->counts();
  return outcome;
}

/// Three zones in exchange, fed at 1 and left from the last one; the quadrature is what has left.
struct Network {
  Eigen::MatrixXd a = Eigen::MatrixXd::Zero(3, 3);
  Eigen::VectorXd b = Eigen::VectorXd::Zero(3);
  Eigen::MatrixXd c = Eigen::MatrixXd::Zero(2, 3);
  Network() {
    a << -2.0, 0.5, 0.0, 1.5, -1.75, 0.25, 0.5, 1.25, -1.25;
    b << 1.0, 0.0, 0.0;
    c << 0.0, 0.0, 1.0, 1.0, 0.0, 0.0;
  }
};

class EachMethod : public testing::TestWithParam<IntegratorKind> {};
INSTANTIATE_TEST_SUITE_P(Integrator, EachMethod,
                         testing::Values(IntegratorKind::multistep, IntegratorKind::one_step),
                         [](const auto& each) {
                           return each.param == IntegratorKind::multistep ? "multistep"
                                                                          : "one_step";
                         });

// Exact: y(t) = exp(A t) (y0 + A^-1 b) - A^-1 b.
TEST_P(EachMethod, LinearNetworkFollowsTheMatrixExponential) {
  const Network network;
  auto system = linear_system(network.a, network.b, network.c);
  const Eigen::Vector3d y0(0.2, 3.0, 0.0);
  const Eigen::Vector3d shift = network.a.inverse() * network.b;
  const double t = 2.5;
  const Eigen::Vector3d exact = Eigen::MatrixXd(network.a * t).exp() * (y0 + shift) - shift;
  double last = 1.0;
  for (const double rtol : {1e-4, 1e-6, 1e-8}) {
    const auto outcome = integrate(*system, GetParam(), rtol, t, {0.2, 3.0, 0.0});
    double error = 0.0;
    for (int i = 0; i < 3; ++i) {
      error = std::max(error, std::abs(outcome.y[static_cast<std::size_t>(i)] / exact(i) - 1.0));
    }
    EXPECT_LT(error, 30.0 * rtol);
    EXPECT_LT(error, last);
    last = error;
    RecordProperty("steps", static_cast<int>(outcome.counts.steps));
  }
}

}  // namespace
}  // namespace stillzone::core
