#include "kinetics/tape.hpp"

#include <gtest/gtest.h>

#include <cmath>
#include <limits>
#include <random>
#include <vector>

#include "kinetics/tape_machine.hpp"
#include "tests/unit/kinetics/random_expressions_support.hpp"

namespace stillzone::kinetics {
namespace {

/// A tape over one input row and one output row, with its scratch.
std::vector<double> run(const Tape& tape, std::size_t n, const std::vector<double>& inputs,
                        std::size_t input_width, std::size_t output_width) {
  std::vector<double> outputs(n * output_width, -777.0);
  std::vector<TapeScratchLine> scratch(tape.scratch_lines());
  const std::vector<TapeInput> in{{inputs.data(), input_width}};
  const std::vector<TapeOutput> out{{outputs.data(), output_width}};
  tape.run(n, in, out, scratch);
  return outputs;
}

Tape compile_one(ExpressionGraph& graph, NodeId root, TapeMachine machine) {
  const std::vector<TapePlace> leaves{{graph.input(0), 0, 0}};
  const std::vector<TapePlace> roots{{root, 0, 0}};
  return Tape(graph, leaves, roots, machine);
}

/// Distance in units of the last place of `expected`.
double ulps(double found, double expected) {
  if (std::isnan(expected)) return std::isnan(found) ? 0.0 : 1e300;
  if (std::isinf(expected)) return std::isinf(found) && found * expected > 0.0 ? 0.0 : 1e300;
  const double magnitude = std::max(std::abs(expected), std::numeric_limits<double>::min());
  return std::abs(found - expected) /
         (std::nextafter(magnitude, std::numeric_limits<double>::infinity()) - magnitude);
}

struct Sample {
  ExpressionGraph graph;
  std::vector<TapePlace> leaves;
  std::vector<TapePlace> roots;
  std::vector<double> inputs;
  std::size_t n_inputs = 6;
};

Sample random_sample(std::mt19937_64& random, std::size_t n_zones) {
  Sample sample;
  RandomExpressions make(sample.graph, random, sample.n_inputs);
  make.grow(60);
  for (std::size_t i = 0; i < sample.n_inputs; ++i) {
    sample.leaves.push_back({sample.graph.input(i), 0, i});
  }
  const std::vector<NodeId> nodes = make.nodes();
  for (std::size_t i = 0; i < 15; ++i) {
    sample.roots.push_back({nodes[nodes.size() - 1 - i * 2], 0, i});
  }
  for (std::size_t z = 0; z < n_zones; ++z) {
    for (const double value : make.point()) sample.inputs.push_back(value);
  }
  return sample;
}

TEST(Tape, EqualsPlainEvaluationForOneToFortyZones) {
  std::mt19937_64 random(7);
  int compared = 0;
  for (std::size_t n = 1; n <= 40; ++n) {
    const Sample s = random_sample(random, n);
    for (const TapeMachine machine : {TapeMachine::automatic, TapeMachine::portable}) {
      const Tape tape(s.graph, s.leaves, s.roots, machine);
      const auto found = run(tape, n, s.inputs, s.n_inputs, s.roots.size());
      for (std::size_t z = 0; z < n; ++z) {
        const std::span<const double> at(s.inputs.data() + z * s.n_inputs, s.n_inputs);
        for (const TapePlace& root : s.roots) {
          const double expected = s.graph.evaluate(root.node, at);
          const double value = found[z * s.roots.size() + root.offset];
          if (!std::isfinite(expected) || std::abs(expected) > 1e12) continue;
          // Rounding of up to 60 operations in another association.
          EXPECT_NEAR(value, expected, 1e-11 * (1.0 + std::abs(expected))) << n << " " << z;
          ++compared;
        }
      }
    }
  }
  EXPECT_GT(compared, 10000);
}

TEST(Tape, DigitsOfAZoneDoNotDependOnItsNeighbours) {
  std::mt19937_64 random(11);
  for (const TapeMachine machine : {TapeMachine::automatic, TapeMachine::portable}) {
    const Sample s = random_sample(random, 40);
    const Tape tape(s.graph, s.leaves, s.roots, machine);
    const auto together = run(tape, 40, s.inputs, s.n_inputs, s.roots.size());
    for (std::size_t n : {1U, 3U, 4U, 7U, 12U, 16U}) {
      for (std::size_t z = 0; z + n <= 40; z += n) {
        const std::vector<double> part(
            s.inputs.begin() + static_cast<std::ptrdiff_t>(z * s.n_inputs),
            s.inputs.begin() + static_cast<std::ptrdiff_t>((z + n) * s.n_inputs));
        const auto alone = run(tape, n, part, s.n_inputs, s.roots.size());
        for (std::size_t i = 0; i < alone.size(); ++i) {
          const double other = together[z * s.roots.size() + i];
          EXPECT_TRUE(std::equal_to<>()(alone[i], other) || std::isnan(other)) << n << " " << z;
        }
      }
    }
  }
}

TEST(Tape, PortableAndFastMachineAgreeToRounding) {
  if (avx2_machine_code() == nullptr) GTEST_SKIP() << "this processor has no AVX2";
  std::mt19937_64 random(5);
  for (int trial = 0; trial < 50; ++trial) {
    const Sample s = random_sample(random, 19);
    const Tape fast(s.graph, s.leaves, s.roots, TapeMachine::automatic);
    const Tape portable(s.graph, s.leaves, s.roots, TapeMachine::portable);
    const auto a = run(fast, 19, s.inputs, s.n_inputs, s.roots.size());
    const auto b = run(portable, 19, s.inputs, s.n_inputs, s.roots.size());
    for (std::size_t i = 0; i < a.size(); ++i) {
      if (!std::isfinite(b[i]) || std::abs(b[i]) > 1e12) continue;
      EXPECT_NEAR(a[i], b[i], 1e-11 * (1.0 + std::abs(b[i])));
    }
  }
}

TEST(Tape, ExponentialIsGoodToOneAndAHalfUlp) {
  ExpressionGraph graph;
  const NodeId root = graph.exp(graph.input(0));
  std::vector<double> at;
  for (double x = -708.0; x < 709.7; x += 0.00317) at.push_back(x);
  for (double x = -1e-3; x < 1e-3; x += 1.7e-7) at.push_back(x);
  for (const TapeMachine machine : {TapeMachine::automatic, TapeMachine::portable}) {
    const auto found = run(compile_one(graph, root, machine), at.size(), at, 1, 1);
    double worst = 0.0;
    for (std::size_t i = 0; i < at.size(); ++i) {
      worst = std::max(worst, ulps(found[i], std::exp(at[i])));
    }
    EXPECT_LE(worst, 1.5);
  }
}

TEST(Tape, ExponentialHandlesTheEndsOfTheRange) {
  ExpressionGraph graph;
  const NodeId root = graph.exp(graph.input(0));
  const double infinity = std::numeric_limits<double>::infinity();
  const std::vector<double> at{0.0,    -0.0,   709.78, 709.79, 1e5,    infinity,  -745.0,
                               -745.2, -720.0, -1e5,   1e300,  -1e300, -infinity, std::nan("")};
  for (const TapeMachine machine : {TapeMachine::automatic, TapeMachine::portable}) {
    const auto found = run(compile_one(graph, root, machine), at.size(), at, 1, 1);
    for (std::size_t i = 0; i < at.size(); ++i) {
      EXPECT_LE(ulps(found[i], std::exp(at[i])), 2.0) << at[i] << " " << found[i];
    }
  }
}

TEST(Tape, IntegerPowersNeedNoPowerFunction) {
  ExpressionGraph graph;
  const NodeId x = graph.input(0);
  for (const int n : {-5, -2, 3, 4, 7, 12, 31}) {
    const Tape tape = compile_one(graph, graph.power(x, graph.constant(n)), TapeMachine::automatic);
    for (const TapeInstruction& i : tape.instructions()) EXPECT_NE(i.op, TapeOp::power);
    const std::vector<double> at{-1.3, 0.7, 2.0};
    const auto found = run(tape, 3, at, 1, 1);
    for (std::size_t i = 0; i < 3; ++i) EXPECT_LE(ulps(found[i], std::pow(at[i], n)), 16.0) << n;
  }
}

TEST(Tape, FusesProductsIntoSums) {
  ExpressionGraph graph;
  const NodeId x = graph.input(0);
  const NodeId y = graph.input(1);
  const NodeId z = graph.input(2);
  const NodeId sum = graph.add(graph.multiply(x, y), graph.multiply(graph.constant(3.0), z));
  const std::vector<TapePlace> leaves{{x, 0, 0}, {y, 0, 1}, {z, 0, 2}};
  const std::vector<TapePlace> roots{{sum, 0, 0}};
  const Tape tape(graph, leaves, roots);
  EXPECT_EQ(tape.instructions().size(), 3U + 2U + 1U);  // loads, two operations, a store
  EXPECT_DOUBLE_EQ(run(tape, 1, {2.0, 5.0, 7.0}, 3, 1)[0], 31.0);
}

TEST(Tape, DividesOnceByASharedDenominator) {
  ExpressionGraph graph;
  const NodeId x = graph.input(0);
  const NodeId y = graph.input(1);
  const NodeId d = graph.add(x, y);
  const std::vector<TapePlace> leaves{{x, 0, 0}, {y, 0, 1}};
  const std::vector<TapePlace> roots{{graph.divide(x, d), 0, 0}, {graph.divide(y, d), 0, 1}};
  const Tape tape(graph, leaves, roots);
  int divisions = 0;
  for (const TapeInstruction& i : tape.instructions()) {
    if (i.op == TapeOp::divide || i.op == TapeOp::reciprocal) ++divisions;
  }
  EXPECT_EQ(divisions, 1);
  EXPECT_DOUBLE_EQ(run(tape, 1, {1.0, 3.0}, 2, 2)[1], 0.75);
}

TEST(Tape, WritesConstantsInputsAndRepeatedRoots) {
  ExpressionGraph graph;
  const NodeId x = graph.input(0);
  const NodeId two = graph.constant(2.0);
  const std::vector<TapePlace> leaves{{x, 0, 0}};
  const std::vector<TapePlace> roots{{two, 0, 0}, {x, 0, 1}, {x, 0, 2}, {two, 0, 3}, {x, 0, 4}};
  for (std::size_t n : {1U, 5U, 16U}) {
    const std::vector<double> at(n, 9.0);
    const auto found = run(Tape(graph, leaves, roots), n, at, 1, 5);
    for (std::size_t z = 0; z < n; ++z) {
      const std::vector<double> row(found.begin() + static_cast<std::ptrdiff_t>(z * 5),
                                    found.begin() + static_cast<std::ptrdiff_t>(z * 5 + 5));
      EXPECT_EQ(row, (std::vector<double>{2.0, 9.0, 9.0, 2.0, 9.0}));
    }
  }
}

TEST(Tape, ReusesTheSlotsOfSpentValues) {
  ExpressionGraph graph;
  NodeId chain = graph.input(0);
  for (int i = 0; i < 100; ++i) chain = graph.exp(graph.negate(chain));
  EXPECT_LE(compile_one(graph, chain, TapeMachine::automatic).n_slots(), 2U);
}

}  // namespace
}  // namespace stillzone::kinetics
