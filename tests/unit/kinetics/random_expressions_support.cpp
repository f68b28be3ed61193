#include "tests/unit/kinetics/random_expressions_support.hpp"

namespace stillzone::kinetics {

RandomExpressions::RandomExpressions(ExpressionGraph& graph, std::mt19937_64& random,
                                     std::size_t n_inputs)
    : graph_(graph), random_(random), n_inputs_(n_inputs) {
  for (std::size_t i = 0; i < n_inputs; ++i) nodes_.push_back(graph_.input(i));
}

double RandomExpressions::uniform(double low, double high) {
  return std::uniform_real_distribution<double>(low, high)(random_);
}

std::vector<double> RandomExpressions::point() {
  std::vector<double> at(n_inputs_);
  for (double& value : at) value = uniform(0.2, 2.0);
  return at;
}

NodeId RandomExpressions::pick() {
  std::uniform_int_distribution<std::size_t> which(0, nodes_.size());
  const std::size_t i = which(random_);
  return i < nodes_.size() ? nodes_[i] : graph_.constant(uniform(-3.0, 3.0));
}

NodeId RandomExpressions::positive() {
  const NodeId a = pick();
  return graph_.add(graph_.multiply(a, a), graph_.constant(uniform(0.1, 1.0)));
}

NodeId RandomExpressions::one_more() {
  switch (std::uniform_int_distribution<int>(0, 13)(random_)) {
    case 0:
      return graph_.add(pick(), pick());
    case 1:
      return graph_.subtract(pick(), pick());
    case 2:
    case 3:
      return graph_.multiply(pick(), pick());
    case 4:
      return graph_.divide(pick(), positive());
    case 5:
      return graph_.power(positive(), graph_.constant(uniform(-2.0, 2.0)));
    case 6: {
      std::uniform_int_distribution<int> exponent(-4, 6);
      return graph_.power(positive(), graph_.constant(exponent(random_)));
    }
    case 7: {
      const NodeId base = positive();
      return graph_.power(base, graph_.divide(pick(), positive()));
    }
    case 8:
      return graph_.negate(pick());
    case 9: {
      const NodeId a = pick();
      return graph_.exp(graph_.divide(a, graph_.add(graph_.constant(1.0), graph_.multiply(a, a))));
    }
    case 10:
      return graph_.log(positive());
    case 11:
      return graph_.sqrt(positive());
    case 12:
      return graph_.minimum(pick(), pick());
    default:
      return graph_.maximum(pick(), pick());
  }
}

NodeId RandomExpressions::grow(int n) {
  for (int i = 0; i < n; ++i) nodes_.push_back(one_more());
  return nodes_.back();
}

std::complex<double> complex_value(const ExpressionGraph& graph, NodeId id,
                                   std::span<const std::complex<double>> inputs) {
  using Op = ExpressionGraph::Op;
  std::vector<std::complex<double>> values(id.value() + 1);
  for (std::size_t i = 0; i <= id.value(); ++i) {
    const ExpressionGraph::Node& n = graph.node(NodeId(i));
    const bool leaf = n.op == Op::constant || n.op == Op::input;
    const std::complex<double> a = leaf ? 0.0 : values[n.a.value()];
    const std::complex<double> b = leaf ? 0.0 : values[n.b.value()];
    switch (n.op) {
      case Op::constant:
        values[i] = n.value;
        break;
      case Op::input:
        values[i] = inputs[n.a.value()];
        break;
      case Op::add:
        values[i] = a + b;
        break;
      case Op::subtract:
        values[i] = a - b;
        break;
      case Op::multiply:
        values[i] = a * b;
        break;
      case Op::divide:
        values[i] = a / b;
        break;
      case Op::power:
        values[i] = std::exp(b * std::log(a));
        break;
      case Op::negate:
        values[i] = -a;
        break;
      case Op::exp:
        values[i] = std::exp(a);
        break;
      case Op::log:
        values[i] = std::log(a);
        break;
      case Op::sqrt:
        values[i] = std::sqrt(a);
        break;
      case Op::minimum:
        values[i] = a.real() < b.real() ? a : b;
        break;
      case Op::maximum:
        values[i] = a.real() > b.real() ? a : b;
        break;
      case Op::step:
        values[i] = a.real() < 0.0 ? 0.0 : 1.0;
        break;
    }
  }
  return values[id.value()];
}

}  // namespace stillzone::kinetics
