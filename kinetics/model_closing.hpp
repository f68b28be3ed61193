#pragma once

#include <cstddef>
#include <string>
#include <string_view>
#include <utility>
#include <variant>
#include <vector>

#include "kinetics/expression_graph.hpp"
#include "kinetics/kinetic_model.hpp"

namespace stillzone::kinetics {

/// What a process conserves.
enum class Balance { cod, carbon, nitrogen, charge };
/// "COD", "C", "N", "charge".
[[nodiscard]] std::string_view balance_name(Balance balance);
[[nodiscard]] double content_of(const Content& content, Balance balance);

/// A coefficient that closes a balance: what its component takes up or gives off so that the
/// process makes nothing out of nothing.
struct Closing {
  std::size_t component = 0;
  Balance balance = Balance::cod;
};

/// Works out the closing coefficients x of one process from
///   sum_i nu_i c_i,b + sum_k x_k c_k,b = 0   for each closed balance b,
/// c being the contents of the components. Several closings are solved together (an inorganic
/// carbon that also carries charge). What is rounding only (1e-14 of the terms) becomes 0.
/// @param given the other coefficients of the process
/// @return one coefficient per closing, or the index of a closing whose component cannot close its
///   balance (it holds none of it, or the closings depend on each other)
[[nodiscard]] std::variant<std::vector<NodeId>, std::size_t> close_balances(
    const std::vector<std::pair<std::size_t, NodeId>>& given, const std::vector<Closing>& closings,
    const std::vector<Component>& components, ExpressionGraph& graph);

}  // namespace stillzone::kinetics
