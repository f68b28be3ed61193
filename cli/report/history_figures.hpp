#pragma once

#include <span>
#include <string>
#include <vector>

#include "network/run_result.hpp"

namespace stillzone::cli {

/// One chart of a history: columns that share a quantity.
struct HistoryChart {
  std::string name;   ///< of the figure and its CSV
  std::string title;  ///< "volatile fatty acids"
  std::string unit;
  std::vector<std::size_t> columns;  ///< of the series
  bool by_quantity = false;          ///< curves carry the quantity's name, not only the place's
};

/// Charts of a history as figures, made short together so that the page stays small: lowest and
/// highest value of every time step of the drawing are kept.
/// @return HTML; empty for an empty history
[[nodiscard]] std::string history_figures(const network::Series& series,
                                          std::span<const HistoryChart> charts);

}  // namespace stillzone::cli
