// What the integrators promise beside numbers: messages of failures, the choice of method, counts,
// no allocation in a step, exceptions handed on.
#include <gmock/gmock.h>
#include <gtest/gtest.h>

#include <Eigen/Dense>
#include <cmath>
#include <limits>
#include <memory>
#include <stdexcept>

#include "core/dae/integrator.hpp"
#include "core/require.hpp"
#include "tests/unit/core/allocation_count_support.hpp"
#include "tests/unit/core/dae_systems_support.hpp"

namespace stillzone::core {
namespace {

using test::FunctionSystem;
using testing::HasSubstr;

/// Substrate and biomass in one zone.
std::unique_ptr<FunctionSystem> culture(double poison_below = -1.0) {
  return std::make_unique<FunctionSystem>(
      2,
      [=](std::span<const double> y, std::span<double> f) {
        const double mu = 0.4 * y[0] / (0.5 + y[0]);
        f[0] = 0.05 * (10.0 - y[0]) - mu * y[1];
        f[1] = (mu - 0.05) * y[1];
        if (y[0] < poison_below) f[1] = std::numeric_limits<double>::quiet_NaN();
      },
      [](std::span<const double> y, Eigen::MatrixXd& j) {
        const double mu = 0.4 * y[0] / (0.5 + y[0]);
        const double slope = 0.2 / ((0.5 + y[0]) * (0.5 + y[0]));
        j(0, 0) = -0.05 - slope * y[1];
        j(0, 1) = -mu;
        j(1, 0) = slope * y[1];
        j(1, 1) = mu - 0.05;
      });
}

Result<Done> run(FunctionSystem& system, IntegratorKind kind, std::vector<double> y,
                 IntegratorOptions options = {}, IntegrationRequest request = {.until = 50.0}) {
  auto solver = make_klu_solver(system.pattern());
  auto integrator = make_integrator(kind, system, *solver, options);
  std::vector<double> q(system.n_quadratures(), 0.0);
  return integrator->integrate(request, y, q);
}

class Contract : public testing::TestWithParam<IntegratorKind> {};
INSTANTIATE_TEST_SUITE_P(Integrator, Contract,
                         testing::Values(IntegratorKind::multistep, IntegratorKind::one_step),
                         [](const auto& each) {
                           return each.param == IntegratorKind::multistep ? "multistep"
                                                                          : "one_step";
                         });

TEST_P(Contract, RatesThatAreNotFiniteAtTheStartAreNamed) {
  auto system = culture(20.0);
  const auto done = run(*system, GetParam(), {10.0, 0.1});
  ASSERT_FALSE(done.ok());
  EXPECT_EQ(done.failure().reason, "the rates are not finite");
  EXPECT_EQ(done.failure().place, "zone 0");
  EXPECT_EQ(done.failure().quantity, "biomass");
  EXPECT_FALSE(done.failure().try_this.empty());
}

// The substrate falls below 5 some days on; from there the rates are no numbers.
TEST_P(Contract, RatesThatTurnNotFiniteOnTheWayAreNamedWithTheTime) {
  auto system = culture(5.0);
  const auto done = run(*system, GetParam(), {10.0, 0.1});
  ASSERT_FALSE(done.ok());
  EXPECT_THAT(done.failure().reason, HasSubstr("the rates are not finite, down to a step of"));
  EXPECT_EQ(done.failure().quantity, "biomass");
  EXPECT_GT(done.failure().time_d, 5.0);
  EXPECT_LT(done.failure().time_d, 50.0);
  EXPECT_THAT(done.failure().got_done, HasSubstr("steps were done"));
}

TEST_P(Contract, ASingularMatrixNamesItsUnknown) {
  // the algebraic relation does not contain its unknown: index 2 or worse
  FunctionSystem system(
      2,
      [](std::span<const double> y, std::span<double> f) {
        f[0] = -y[0];
        f[1] = y[0] - 1.0;
      },
      [](std::span<const double>, Eigen::MatrixXd& j) { j << -1.0, 0.0, 1.0, 0.0; });
  system.differential_flags = {1, 0};
  const auto done = run(system, GetParam(), {1.0, 0.0});
  ASSERT_FALSE(done.ok());
  EXPECT_THAT(done.failure().reason, HasSubstr("the matrix of the step is singular"));
  EXPECT_EQ(done.failure().quantity, "biomass");
}

TEST_P(Contract, TooManyStepsIsAFailureWithTheLimit) {
  auto system = culture();
  const auto done = run(*system, GetParam(), {10.0, 0.1}, {.most_steps = 5});
  ASSERT_FALSE(done.ok());
  EXPECT_THAT(done.failure().text(), HasSubstr("more than 5 steps are needed"));
}

// y' = y^2 from 1 ends at t = 1: no step however small passes it.
TEST_P(Contract, ABlowUpEndsInAFailureNearItsTime) {
  FunctionSystem system(
      1, [](std::span<const double> y, std::span<double> f) { f[0] = y[0] * y[0]; },
      [](std::span<const double> y, Eigen::MatrixXd& j) { j(0, 0) = 2.0 * y[0]; });
  const auto done = run(system, GetParam(), {1.0});
  ASSERT_FALSE(done.ok());
  EXPECT_NEAR(done.failure().time_d, 1.0, 1e-3);
  EXPECT_EQ(done.failure().place, "zone 0");
}

TEST_P(Contract, AnExceptionOfTheModelComesOutAsItIs) {
  FunctionSystem system(
      1,
      [](std::span<const double> y, std::span<double> f) {
        if (y[0] < 0.9) throw std::runtime_error("out of memory for a table");
        f[0] = -1.0;
      },
      [](std::span<const double>, Eigen::MatrixXd& j) { j(0, 0) = 0.0; });
  EXPECT_THROW(static_cast<void>(run(system, GetParam(), {1.0})), std::runtime_error);
}

TEST_P(Contract, StepsAllocateNothing) {
  auto system = culture();
  system->quadratures = 1;
  system->quadrature = [](std::span<const double> y, std::span<double> g) { g[0] = y[1]; };
  system->quadrature_along = [](std::span<const double>, std::span<const double> v,
                                std::span<double> gv) { gv[0] = v[1]; };
  std::vector<double> times;
  for (int k = 0; k < 100; ++k) times.push_back(0.5 * k);
  long first = -1;
  long last = -1;
  int n = 0;
  IntegrationRequest request;
  request.until = 50.0;
  request.record_at = times;
  request.record = [](double, std::span<const double>, std::span<const double>) {};
  request.progress = [&](double) {
    ++n;
    if (n == 3) first = test::allocation_count();
    last = test::allocation_count();
  };
  ASSERT_TRUE(run(*system, GetParam(), {10.0, 0.1}, {}, request).ok());
  EXPECT_GT(n, 10);
  EXPECT_EQ(last - first, 0);
}

TEST_P(Contract, CountsAddUpOverCalls) {
  auto system = culture();
  auto solver = make_klu_solver(system->pattern());
  auto integrator = make_integrator(GetParam(), *system, *solver, {});
  std::vector<double> y = {10.0, 0.1};
  std::vector<double> q;
  ASSERT_TRUE(integrator->integrate({.until = 20.0}, y, q).ok());
  const auto first = integrator->counts();
  ASSERT_TRUE(integrator->integrate({.from = 20.0, .until = 40.0}, y, q).ok());
  const auto& both = integrator->counts();
  EXPECT_GT(first.steps, 0);
  EXPECT_GT(both.steps, first.steps);
  EXPECT_EQ(both.rate_calls, system->rate_calls);
  EXPECT_EQ(both.jacobian_calls, system->jacobian_calls);
  EXPECT_EQ(both.factorisations, static_cast<long>(solver->n_factorisations));
  EXPECT_EQ(both.solves, static_cast<long>(solver->n_solves));
  EXPECT_EQ(both.linear_solver, "KLU, AMD ordering");
}

TEST_P(Contract, ARequestOfNoLengthRecordsTheStart) {
  auto system = culture();
  const std::vector<double> times = {3.0};
  int records = 0;
  IntegrationRequest request;
  request.from = 3.0;
  request.until = 3.0;
  request.record_at = times;
  request.record = [&](double t, std::span<const double> y, std::span<const double>) {
    EXPECT_DOUBLE_EQ(t, 3.0);
    EXPECT_DOUBLE_EQ(y[0], 10.0);
    ++records;
  };
  ASSERT_TRUE(run(*system, GetParam(), {10.0, 0.1}, {}, request).ok());
  EXPECT_EQ(records, 1);
}

TEST_P(Contract, TheLongestStepIsKept) {
  auto system = culture();
  double before = 0.0;
  double longest = 0.0;
  IntegrationRequest request;
  request.until = 50.0;
  request.progress = [&](double t) {
    longest = std::max(longest, t - before);
    before = t;
  };
  ASSERT_TRUE(run(*system, GetParam(), {10.0, 0.1}, {.longest_step = 0.7}, request).ok());
  EXPECT_LE(longest, 0.7 * (1.0 + 1e-12));
}

#ifndef NDEBUG
TEST_P(Contract, AnEntryTheModelLeavesOutIsNamed) {
  FunctionSystem system(
      2, [](std::span<const double> y, std::span<double> f) { f[0] = -y[0]; },
      [](std::span<const double>, Eigen::MatrixXd& j) { j(0, 0) = -1.0; });
  try {
    static_cast<void>(run(system, GetParam(), {1.0, 1.0}));
    FAIL() << "no defect thrown";
  } catch (const ProgramDefect& defect) {
    EXPECT_THAT(defect.what(), HasSubstr("rates() left out entry 1 (zone 0, biomass)"));
  }
}
#endif

IntegratorCounts chosen_for(double switch_every, double rtol) {
  auto system = culture();
  for (int k = 1; switch_every > 0.0 && k * switch_every < 50.0; ++k) {
    system->switch_times.push_back(k * switch_every);
  }
  auto solver = make_klu_solver(system->pattern());
  auto integrator =
      make_integrator(IntegratorKind::automatic, *system, *solver, {.relative_tolerance = rtol});
  std::vector<double> y = {10.0, 0.1};
  std::vector<double> q;
  EXPECT_TRUE(integrator->integrate({.until = 50.0}, y, q).ok());
  return integrator->counts();
}

TEST(AutomaticIntegrator, TakesTheOneStepMethodWhenSwitchesAreDense) {
  const auto counts = chosen_for(1.0, 1e-6);
  EXPECT_EQ(counts.method, "one-step (RODAS4)");
  EXPECT_THAT(counts.reason, HasSubstr("49 switches in 50 d at relative tolerance 1e-06"));
}

TEST(AutomaticIntegrator, TakesTheMultistepMethodOnLongSmoothStretches) {
  const auto counts = chosen_for(0.0, 1e-6);
  EXPECT_EQ(counts.method, "multistep (IDAS)");
  EXPECT_THAT(counts.reason, HasSubstr("0 switches in 50 d"));
}

TEST(AutomaticIntegrator, TakesTheOneStepMethodForASmallSystemAtLooseTolerance) {
  EXPECT_EQ(chosen_for(0.0, 1e-3).method, "one-step (RODAS4)");
}

}  // namespace
}  // namespace stillzone::core
