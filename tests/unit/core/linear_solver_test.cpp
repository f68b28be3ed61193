#include "core/dae/linear_solver.hpp"

#include <gtest/gtest.h>

#include <Eigen/Dense>
#include <cmath>
#include <limits>
#include <random>
#include <vector>

namespace stillzone::core {
namespace {

struct Problem {
  SparsePattern pattern;
  std::vector<double> jacobian;
  std::vector<double> diagonal;

  Eigen::MatrixXd dense() const {
    const auto n = static_cast<Eigen::Index>(pattern.n);
    Eigen::MatrixXd result = Eigen::MatrixXd::Zero(n, n);
    for (std::size_t j = 0; j < diagonal.size(); ++j) {
      for (auto k = pattern.start[j]; k < pattern.start[j + 1]; ++k) {
        const auto at = static_cast<std::size_t>(k);
        result(pattern.row[at], static_cast<Eigen::Index>(j)) = -jacobian[at];
      }
      result(static_cast<Eigen::Index>(j), static_cast<Eigen::Index>(j)) += diagonal[j];
    }
    return result;
  }
};

Problem random_problem(std::int64_t n, unsigned seed) {
  std::mt19937 random(seed);
  std::uniform_int_distribution<std::int64_t> index(0, n - 1);
  std::uniform_real_distribution<double> value(-1.0, 1.0);
  std::vector<SparsePattern::Entry> entries;
  for (std::int64_t k = 0; k < 4 * n; ++k) entries.push_back({index(random), index(random)});
  Problem problem{SparsePattern::of(n, entries), {}, {}};
  problem.jacobian.resize(problem.pattern.row.size());
  problem.diagonal.resize(static_cast<std::size_t>(n));
  for (double& v : problem.jacobian) v = value(random);
  for (double& v : problem.diagonal) v = value(random);
  return problem;
}

/// Largest |A x - b| against |A| |x| + |b|: a few units of rounding for a stable solution.
double backward_error(const Problem& problem, LinearSolver& solver) {
  const Eigen::MatrixXd a = problem.dense();
  Eigen::VectorXd b(a.rows());
  for (Eigen::Index i = 0; i < b.size(); ++i) b(i) = std::sin(static_cast<double>(i) + 1.0);
  std::vector<double> x(b.data(), b.data() + b.size());
  solver.solve(x);
  const Eigen::Map<const Eigen::VectorXd> solution(x.data(), b.size());
  const Eigen::VectorXd residual = a * solution - b;
  const Eigen::VectorXd scale = a.cwiseAbs() * solution.cwiseAbs() + b.cwiseAbs();
  return residual.cwiseQuotient(scale).cwiseAbs().maxCoeff();
}

TEST(KluSolver, SolvesRandomMatricesToRounding) {
  for (unsigned seed = 1; seed <= 20; ++seed) {
    const Problem problem = random_problem(60, seed);
    auto solver = make_klu_solver(problem.pattern);
    ASSERT_TRUE(solver->factor(problem.diagonal, problem.jacobian));
    EXPECT_LT(backward_error(problem, *solver), 1e-11) << seed;
  }
}

// First the diagonal dominates and becomes the pivots; then it is nearly zero and a cyclic shift
// dominates: kept pivots would leave no correct digit.
TEST(KluSolver, ChoosesNewPivotsWhenTheOldOnesDoNotSuit) {
  constexpr std::int64_t kN = 40;
  std::vector<SparsePattern::Entry> entries;
  for (std::int64_t i = 0; i < kN; ++i) entries.push_back({(i + 1) % kN, i});
  for (std::int64_t i = 0; i < kN; ++i) entries.push_back({(7 * i + 3) % kN, i});
  Problem problem{SparsePattern::of(kN, entries), {}, {}};
  problem.jacobian.assign(problem.pattern.row.size(), -0.1);
  problem.diagonal.assign(kN, 50.0);
  auto solver = make_klu_solver(problem.pattern);
  ASSERT_TRUE(solver->factor(problem.diagonal, problem.jacobian));
  EXPECT_LT(backward_error(problem, *solver), 1e-14);
  for (std::int64_t i = 0; i < kN; ++i) {
    problem.jacobian[static_cast<std::size_t>(problem.pattern.find((i + 1) % kN, i))] = -5.0;
    problem.jacobian[static_cast<std::size_t>(problem.pattern.find(i, i))] = -1e-18;
  }
  problem.diagonal.assign(kN, 0.0);
  ASSERT_TRUE(solver->factor(problem.diagonal, problem.jacobian));
  EXPECT_LT(backward_error(problem, *solver), 1e-13);
}

TEST(KluSolver, NamesAColumnOfASingularMatrix) {
  // rows and columns 1 and 2 alike: column 1 or 2 is at fault
  const auto pattern = SparsePattern::of(3, {{1, 2}, {2, 1}});
  auto solver = make_klu_solver(pattern);
  std::vector<double> jacobian(pattern.row.size(), -1.0);
  const std::vector<double> none(3, 0.0);
  EXPECT_FALSE(solver->factor(none, jacobian));
  EXPECT_GE(solver->singular_column(), 1);
  EXPECT_LE(solver->singular_column(), 2);
  // and recovers
  const std::vector<double> shifted = {0.0, 1.0, 0.0};
  EXPECT_TRUE(solver->factor(shifted, jacobian));
  EXPECT_EQ(solver->n_factorisations, 2U);
}

TEST(KluSolver, NamesTheColumnOfANumberThatIsNotFinite) {
  const auto pattern = SparsePattern::of(3, {{1, 2}, {2, 1}});
  auto solver = make_klu_solver(pattern);
  std::vector<double> jacobian(pattern.row.size(), -1.0);
  jacobian[static_cast<std::size_t>(pattern.find(1, 2))] = std::numeric_limits<double>::quiet_NaN();
  EXPECT_FALSE(solver->factor(std::vector<double>(3, 1.0), jacobian));
  EXPECT_EQ(solver->singular_column(), 2);
}

}  // namespace
}  // namespace stillzone::core
