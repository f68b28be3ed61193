#include "kinetics/expression_graph.hpp"

#include <gtest/gtest.h>

#include <array>
#include <cmath>
#include <complex>
#include <random>
#include <vector>

#include "tests/unit/kinetics/random_expressions_support.hpp"

namespace stillzone::kinetics {
namespace {

using Op = ExpressionGraph::Op;

class Expressions : public ::testing::Test {
 protected:
  ExpressionGraph g;
  NodeId x = g.input(0);
  NodeId y = g.input(1);
  NodeId z = g.input(2);
  NodeId c(double value) { return g.constant(value); }
};

TEST_F(Expressions, EqualSubexpressionsAreOneNode) {
  EXPECT_EQ(g.add(x, g.multiply(y, z)), g.add(g.multiply(z, y), x));
  const std::size_t before = g.size();
  (void)g.multiply(y, z);
  EXPECT_EQ(g.size(), before);
  EXPECT_EQ(g.minimum(x, y), g.minimum(y, x));
  EXPECT_NE(g.subtract(x, y), g.subtract(y, x));
}

TEST_F(Expressions, NeutralElementsVanish) {
  EXPECT_EQ(g.add(x, c(0.0)), x);
  EXPECT_EQ(g.subtract(x, c(0.0)), x);
  EXPECT_EQ(g.multiply(c(1.0), x), x);
  EXPECT_EQ(g.divide(x, c(1.0)), x);
  EXPECT_EQ(g.power(x, c(1.0)), x);
  EXPECT_EQ(g.multiply(x, c(0.0)), c(0.0));
  EXPECT_EQ(g.divide(c(0.0), x), c(0.0));
  EXPECT_EQ(g.power(x, c(0.0)), c(1.0));
  EXPECT_EQ(g.subtract(x, x), c(0.0));
  EXPECT_EQ(g.multiply(x, c(-0.0)), c(0.0));
}

TEST_F(Expressions, SignsAreMovedOutward) {
  EXPECT_EQ(g.negate(g.negate(x)), x);
  EXPECT_EQ(g.add(x, g.negate(y)), g.subtract(x, y));
  EXPECT_EQ(g.subtract(x, g.negate(y)), g.add(x, y));
  EXPECT_EQ(g.negate(g.subtract(x, y)), g.subtract(y, x));
  EXPECT_EQ(g.multiply(g.negate(x), g.negate(y)), g.multiply(x, y));
  EXPECT_EQ(g.divide(g.negate(x), g.negate(y)), g.divide(x, y));
  EXPECT_EQ(g.multiply(c(-1.0), x), g.negate(x));
}

TEST_F(Expressions, ConstantsAreFoldedAndGathered) {
  EXPECT_EQ(g.add(c(1.0), c(2.0)), c(3.0));
  EXPECT_EQ(g.multiply(c(2.0), g.multiply(c(3.0), x)), g.multiply(c(6.0), x));
  EXPECT_EQ(g.add(c(2.0), g.add(c(3.0), x)), g.add(c(5.0), x));
  EXPECT_EQ(g.divide(x, c(4.0)), g.multiply(c(0.25), x));
  EXPECT_EQ(g.add(x, x), g.multiply(c(2.0), x));
}

TEST_F(Expressions, AConstantIsNeverFoldedIntoANonFiniteValue) {
  EXPECT_EQ(g.node(g.divide(c(1.0), c(0.0))).op, Op::divide);
  EXPECT_EQ(g.node(g.log(c(0.0))).op, Op::log);
  EXPECT_EQ(g.node(g.exp(c(1000.0))).op, Op::exp);
  EXPECT_EQ(g.node(g.sqrt(c(-1.0))).op, Op::sqrt);
  EXPECT_EQ(g.node(g.multiply(c(1e200), c(1e200))).op, Op::multiply);
}

TEST_F(Expressions, PowersTakeTheirCheapestForm) {
  EXPECT_EQ(g.power(x, c(0.5)), g.sqrt(x));
  EXPECT_EQ(g.power(x, c(2.0)), g.multiply(x, x));
  EXPECT_EQ(g.power(x, c(-1.0)), g.divide(c(1.0), x));
  EXPECT_EQ(g.node(g.power(c(10.0), x)).op, Op::exp);
  EXPECT_EQ(g.node(g.power(g.power(c(10.0), x), c(2.5))).op, Op::exp);
  EXPECT_EQ(g.log(g.exp(x)), x);
}

TEST_F(Expressions, InputsOfANodeAreThoseItDependsOn) {
  const NodeId node = g.add(g.multiply(z, z), g.exp(x));
  EXPECT_EQ(g.inputs_of(node), (std::vector<std::size_t>{0, 2}));
  EXPECT_TRUE(g.inputs_of(c(1.0)).empty());
}

TEST_F(Expressions, PolynomialDerivativesAreTheTextbookNodes) {
  EXPECT_EQ(g.derivative(g.power(x, c(3.0)), 0), g.multiply(c(3.0), g.multiply(x, x)));
  EXPECT_EQ(g.derivative(g.multiply(x, y), 0), y);
  EXPECT_EQ(g.derivative(g.multiply(x, y), 2), c(0.0));
  EXPECT_EQ(g.derivative(g.exp(x), 0), g.exp(x));
  EXPECT_EQ(g.derivative(g.log(x), 0), g.divide(c(1.0), x));
}

TEST_F(Expressions, DerivativesAreFiniteWhereTheFunctionIsSmooth) {
  const std::array<double, 3> zero{0.0, 0.0, 0.0};
  for (const double n : {2.0, 3.0, 4.0, 1.5, 2.5}) {
    EXPECT_DOUBLE_EQ(g.evaluate(g.derivative(g.power(x, c(n)), 0), zero), 0.0) << n;
  }
  const NodeId monod = g.divide(x, g.add(c(0.2), x));
  EXPECT_DOUBLE_EQ(g.evaluate(g.derivative(monod, 0), zero), 5.0);
}

TEST_F(Expressions, MinimumAndMaximumSwitchTheirDerivative) {
  const NodeId low = g.minimum(g.multiply(c(3.0), x), y);
  const NodeId high = g.maximum(g.multiply(c(3.0), x), y);
  const std::array<double, 3> left{0.1, 1.0, 0.0};
  const std::array<double, 3> right{1.0, 1.0, 0.0};
  EXPECT_DOUBLE_EQ(g.evaluate(g.derivative(low, 0), left), 3.0);
  EXPECT_DOUBLE_EQ(g.evaluate(g.derivative(low, 0), right), 0.0);
  EXPECT_DOUBLE_EQ(g.evaluate(g.derivative(low, 1), right), 1.0);
  EXPECT_DOUBLE_EQ(g.evaluate(g.derivative(high, 0), left), 0.0);
  EXPECT_DOUBLE_EQ(g.evaluate(g.derivative(high, 0), right), 3.0);
  EXPECT_DOUBLE_EQ(g.evaluate(g.derivative(high, 1), left), 1.0);
}

TEST_F(Expressions, OutOfDomainIsNotANumber) {
  const std::array<double, 3> negative{-1e-9, 0.0, 0.0};
  EXPECT_TRUE(std::isnan(g.evaluate(g.power(x, c(1.5)), negative)));
  EXPECT_TRUE(std::isnan(g.evaluate(g.log(x), negative)));
  EXPECT_TRUE(std::isnan(g.evaluate(g.sqrt(x), negative)));
  const std::array<double, 3> nan{std::nan(""), 0.0, 0.0};
  EXPECT_TRUE(std::isnan(g.evaluate(g.maximum(x, y), nan)));
  EXPECT_TRUE(std::isnan(g.evaluate(g.minimum(y, x), nan)));
}

TEST_F(Expressions, AVeryLongChainIsDifferentiatedWithoutRecursion) {
  NodeId chain = x;
  for (int i = 0; i < 200000; ++i) chain = g.exp(g.multiply(c(1e-3), chain));
  const std::array<double, 3> at{0.5, 0.0, 0.0};
  EXPECT_TRUE(std::isfinite(g.evaluate(g.derivative(chain, 0), at)));
}

// A derivative is right when it agrees with the complex step Im f(x + ih) / h, which has no
// cancellation (Squire and Trapp 1998, Using complex variables to estimate derivatives).
TEST(RandomExpressions, DerivativesAgreeWithTheComplexStep) {
  std::mt19937_64 random(20260101);
  int compared = 0;
  for (int trial = 0; trial < 400; ++trial) {
    ExpressionGraph graph;
    RandomExpressions make(graph, random, 4);
    const NodeId f = make.grow(30);
    const std::vector<double> at = make.point();
    for (std::size_t k = 0; k < at.size(); ++k) {
      std::vector<std::complex<double>> shifted(at.begin(), at.end());
      shifted[k] += std::complex<double>(0.0, 1e-40);
      const double expected = complex_value(graph, f, shifted).imag() / 1e-40;
      if (!std::isfinite(expected) || std::abs(expected) > 1e12) continue;
      const double found = graph.evaluate(graph.derivative(f, k), at);
      // Rounding of about 30 operations, some of which cancel.
      EXPECT_NEAR(found, expected, 1e-10 * (1.0 + std::abs(expected))) << trial << " " << k;
      ++compared;
    }
  }
  EXPECT_GT(compared, 1000);
}

}  // namespace
}  // namespace stillzone::kinetics
