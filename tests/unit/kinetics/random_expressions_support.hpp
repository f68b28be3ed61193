#pragma once

#include <complex>
#include <cstddef>
#include <random>
#include <span>
#include <vector>

#include "kinetics/expression_graph.hpp"

namespace stillzone::kinetics {

/// Grows random expressions over `n_inputs` inputs that stay in the domain of every function at
/// points of [0.2, 2]: arguments of log, sqrt and powers are made positive, exponentials bounded.
class RandomExpressions {
 public:
  RandomExpressions(ExpressionGraph& graph, std::mt19937_64& random, std::size_t n_inputs);

  /// Adds `n` random operations; the last node.
  NodeId grow(int n);
  /// The inputs and every node grown so far.
  [[nodiscard]] const std::vector<NodeId>& nodes() const { return nodes_; }
  [[nodiscard]] std::vector<double> point();

 private:
  NodeId pick();
  NodeId positive();
  NodeId one_more();
  double uniform(double low, double high);

  ExpressionGraph& graph_;
  std::mt19937_64& random_;
  std::size_t n_inputs_;
  std::vector<NodeId> nodes_;
};

/// The expression with complex inputs; min, max and step decide by real parts.
std::complex<double> complex_value(const ExpressionGraph& graph, NodeId id,
                                   std::span<const std::complex<double>> inputs);

}  // namespace stillzone::kinetics
