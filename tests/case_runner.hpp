#pragma once

#include <gtest/gtest.h>

#include <cmath>
#include <filesystem>
#include <functional>
#include <memory>
#include <string>
#include <string_view>

#include "core/fault.hpp"
#include "core/json_document.hpp"
#include "core/units.hpp"
#include "network/case.hpp"
#include "network/flow_balance.hpp"
#include "network/run_result.hpp"
#include "network/simulation.hpp"

/// Runs case files through the functions the program uses: document -> case -> balance -> result.
namespace stillzone::testing {

struct LoadedCase {
  network::Case the_case;
  network::FlowBalance balance;
};

/// Null after a failed expectation when the document has faults.
inline std::unique_ptr<LoadedCase> load(const core::JsonDocument& document) {
  core::FaultList faults;
  const core::UnitReader units;
  auto the_case = network::read_case(document, units, faults);
  if (!the_case) {
    ADD_FAILURE() << faults.text();
    return nullptr;
  }
  auto balance = network::FlowBalance::solve(*the_case, document, faults);
  if (!balance) {
    ADD_FAILURE() << faults.text();
    return nullptr;
  }
  return std::make_unique<LoadedCase>(LoadedCase{std::move(*the_case), std::move(*balance)});
}

inline std::unique_ptr<LoadedCase> load_text(std::string_view text) {
  core::FaultList faults;
  const auto document = core::JsonDocument::parse(text, "test.json", ".", faults);
  if (!document) {
    ADD_FAILURE() << faults.text();
    return nullptr;
  }
  return load(*document);
}

inline std::unique_ptr<LoadedCase> load_file(const std::filesystem::path& path) {
  core::FaultList faults;
  const auto document = core::JsonDocument::read(path, faults);
  if (!document) {
    ADD_FAILURE() << faults.text();
    return nullptr;
  }
  return load(*document);
}

/// An empty result after a failed expectation when the run fails.
inline network::RunResult run(const LoadedCase& loaded) {
  auto result = network::run_case(loaded.the_case, loaded.balance, {});
  if (!result) {
    ADD_FAILURE() << result.failure().text();
    return {};
  }
  return std::move(result).value();
}

/// NaN (which no expectation accepts) when there is no such value.
inline double value_in(const std::vector<network::NamedValue>& values, std::string_view name) {
  for (const auto& value : values) {
    if (value.name == name) return value.value;
  }
  return std::nan("");
}

inline double zone_value(const network::RunResult& result, std::string_view zone,
                         std::string_view name) {
  for (const auto& place : result.zones) {
    if (place.place != zone) continue;
    const double in_state = value_in(place.state, name);
    return std::isnan(in_state) ? value_in(place.derived, name) : in_state;
  }
  return std::nan("");
}

inline const network::Series::Column* find_column(const network::Series& series,
                                                  std::string_view place,
                                                  std::string_view quantity) {
  for (const auto& column : series.columns) {
    if (column.place == place && column.quantity == quantity) return &column;
  }
  return nullptr;
}

/// The value at the record time nearest to t, which must lie within 1e-9 d.
inline double series_value(const network::Series& series, std::string_view place,
                           std::string_view quantity, double t) {
  const auto* column = find_column(series, place, quantity);
  if (column == nullptr) return std::nan("");
  for (std::size_t k = 0; k < series.time.size(); ++k) {
    if (std::abs(series.time[k] - t) < 1e-9) return column->values[k];
  }
  return std::nan("");
}

}  // namespace stillzone::testing
