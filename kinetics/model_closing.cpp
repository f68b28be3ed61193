#include "kinetics/model_closing.hpp"

#include <Eigen/Dense>
#include <cmath>

namespace stillzone::kinetics {

namespace {

constexpr double kRounding = 1e-14;

/// -(sum of what the given coefficients make) of one balance; exactly 0 when only rounding is left.
NodeId missing_amount(const std::vector<std::pair<std::size_t, NodeId>>& given, Balance balance,
                      const std::vector<Component>& components, ExpressionGraph& graph) {
  NodeId sum = graph.constant(0.0);
  double size = 0.0;
  for (const auto& [component, coefficient] : given) {
    const double content = content_of(components[component].content, balance);
    const NodeId amount = graph.multiply(graph.constant(content), coefficient);
    if (graph.is_constant(amount)) size += std::abs(graph.node(amount).value);
    sum = graph.add(sum, amount);
  }
  if (graph.is_constant(sum) && std::abs(graph.node(sum).value) <= kRounding * size) {
    return graph.constant(0.0);
  }
  return graph.negate(sum);
}

}  // namespace

std::string_view balance_name(Balance balance) {
  switch (balance) {
    case Balance::cod:
      return "COD";
    case Balance::carbon:
      return "C";
    case Balance::nitrogen:
      return "N";
    case Balance::charge:
      return "charge";
  }
  return "";
}

double content_of(const Content& content, Balance balance) {
  switch (balance) {
    case Balance::cod:
      return content.cod;
    case Balance::carbon:
      return content.carbon;
    case Balance::nitrogen:
      return content.nitrogen;
    case Balance::charge:
      return content.charge;
  }
  return 0.0;
}

std::variant<std::vector<NodeId>, std::size_t> close_balances(
    const std::vector<std::pair<std::size_t, NodeId>>& given, const std::vector<Closing>& closings,
    const std::vector<Component>& components, ExpressionGraph& graph) {
  if (closings.empty()) return std::vector<NodeId>{};
  const auto n = static_cast<Eigen::Index>(closings.size());
  Eigen::MatrixXd contents(n, n);
  for (Eigen::Index row = 0; row < n; ++row) {
    const Balance balance = closings[static_cast<std::size_t>(row)].balance;
    for (Eigen::Index column = 0; column < n; ++column) {
      const Closing& by = closings[static_cast<std::size_t>(column)];
      contents(row, column) = content_of(components[by.component].content, balance);
    }
    if (!(std::abs(contents(row, row)) > 0.0)) return static_cast<std::size_t>(row);
  }
  const Eigen::FullPivLU<Eigen::MatrixXd> factors(contents);
  if (!factors.isInvertible()) return closings.size() - 1;
  const Eigen::MatrixXd inverse = factors.inverse();
  std::vector<NodeId> missing;
  for (const Closing& closing : closings) {
    missing.push_back(missing_amount(given, closing.balance, components, graph));
  }
  std::vector<NodeId> coefficients;
  for (Eigen::Index k = 0; k < n; ++k) {
    NodeId coefficient = graph.constant(0.0);
    for (Eigen::Index b = 0; b < n; ++b) {
      coefficient = graph.add(coefficient, graph.multiply(graph.constant(inverse(k, b)),
                                                          missing[static_cast<std::size_t>(b)]));
    }
    coefficients.push_back(coefficient);
  }
  return coefficients;
}

}  // namespace stillzone::kinetics
