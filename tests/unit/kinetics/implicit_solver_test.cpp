#include "kinetics/implicit_solver.hpp"

#include <gtest/gtest.h>

#include <array>
#include <cmath>

namespace stillzone::kinetics {
namespace {

Implicit unknown(const char* name, double start, double low, double high) {
  return {name, "", "", start, low, high};
}

TEST(ImplicitSolver, OneRootOfAFallingFunctionIsFound) {
  const ImplicitFunction f = [](auto at, auto residual, auto derivative) {
    residual[0] = 2.0 - std::exp(at[0]);
    derivative[0] = -std::exp(at[0]);
  };
  double x = 5.0;
  ASSERT_TRUE(solve_implicit_equations({unknown("x", 0.0, -50.0, 50.0)}, {&x, 1}, f).ok());
  EXPECT_DOUBLE_EQ(x, std::log(2.0));
}

TEST(ImplicitSolver, NewtonThatWouldLeaveTheRangeIsBisected) {
  // Newton alone diverges on atan from |x| > 1.4.
  const ImplicitFunction f = [](auto at, auto residual, auto derivative) {
    residual[0] = std::atan(at[0] - 3.0);
    derivative[0] = 1.0 / (1.0 + (at[0] - 3.0) * (at[0] - 3.0));
  };
  double x = -900.0;
  ASSERT_TRUE(solve_implicit_equations({unknown("x", 0.0, -1000.0, 1000.0)}, {&x, 1}, f).ok());
  EXPECT_NEAR(x, 3.0, 1e-14);
}

TEST(ImplicitSolver, ARootAtTheEndOfTheRangeCounts) {
  const ImplicitFunction f = [](auto at, auto residual, auto derivative) {
    residual[0] = at[0];
    derivative[0] = 1.0;
  };
  double x = 0.7;
  ASSERT_TRUE(solve_implicit_equations({unknown("x", 0.5, 0.0, 1.0)}, {&x, 1}, f).ok());
  EXPECT_DOUBLE_EQ(x, 0.0);
}

// x^2 + y^2 = 25 and x = y + 1 meet at (4, 3) for positive x and y.
const ImplicitFunction kCircleAndLine = [](auto at, auto residual, auto derivative) {
  residual[0] = at[0] * at[0] + at[1] * at[1] - 25.0;
  residual[1] = 1e6 * (at[0] - at[1] - 1.0);
  derivative[0] = 2.0 * at[0];
  derivative[1] = 2.0 * at[1];
  derivative[2] = 1e6;
  derivative[3] = -1e6;
};

TEST(ImplicitSolver, SeveralEquationsAreSolvedTogetherFromAnyStart) {
  for (const double start : {0.1, 1.0, 9.0, 99.0, std::nan("")}) {
    std::array<double, 2> values{start, start};
    ASSERT_TRUE(
        solve_implicit_equations({unknown("x", 2.0, 0.0, 100.0), unknown("y", 2.0, 0.0, 100.0)},
                                 values, kCircleAndLine)
            .ok())
        << start;
    EXPECT_NEAR(values[0], 4.0, 1e-14);
    EXPECT_NEAR(values[1], 3.0, 1e-14);
  }
}

TEST(ImplicitSolver, SeveralEquationsWithoutASolutionInRangeFailAndKeepTheValues) {
  std::array<double, 2> values{10.0, 10.0};
  const auto solved = solve_implicit_equations(
      {unknown("x", 10.0, 8.0, 100.0), unknown("y", 10.0, 8.0, 100.0)}, values, kCircleAndLine);
  ASSERT_FALSE(solved.ok());
  EXPECT_NE(solved.failure().reason.find("no solution inside their ranges"), std::string::npos)
      << solved.failure().reason;
  EXPECT_EQ(values, (std::array<double, 2>{10.0, 10.0}));
}

}  // namespace
}  // namespace stillzone::kinetics
