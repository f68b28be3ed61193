#include "cli/series_csv.hpp"

#include <fmt/format.h>

#include "core/csv_table.hpp"

namespace stillzone::cli {

std::string series_csv(const network::Series& series) {
  std::string text = "time_d";
  for (const auto& column : series.columns) {
    text +=
        "," + core::csv_cell(fmt::format("{}.{} [{}]", column.place, column.quantity, column.unit));
  }
  text += "\n";
  for (std::size_t i = 0; i < series.time.size(); ++i) {
    text += core::csv_number(series.time[i]);
    for (const auto& column : series.columns) {
      text += ",";
      text += core::csv_number(column.values[i]);
    }
    text += "\n";
  }
  return text;
}

}  // namespace stillzone::cli
