#pragma once

#include <filesystem>
#include <optional>
#include <string>
#include <string_view>
#include <vector>

#include "core/fault.hpp"

namespace stillzone::core {

/// A table as text cells, with what is needed to point at a cell. Reads what spreadsheets export:
/// byte-order mark, comma / semicolon / tab as separator, decimal commas (with semicolon or tab),
/// quoted cells, CRLF, blank lines, lines that start with '#', a first line "sep=;". Text that is
/// no UTF-8 is taken as Latin-1, as older programs write it. Rows shorter or longer than the header
/// (empty cells at the end aside) and quotes gone wrong are faults with their line.
class CsvTable {
 public:
  [[nodiscard]] static std::optional<CsvTable> parse(std::string_view text, std::string name,
                                                     FaultList& faults);
  [[nodiscard]] static std::optional<CsvTable> read(const std::filesystem::path& path,
                                                    FaultList& faults);

  [[nodiscard]] const std::string& name() const { return name_; }
  [[nodiscard]] const std::vector<std::string>& header() const { return header_; }
  [[nodiscard]] std::size_t n_rows() const { return rows_.size(); }
  [[nodiscard]] std::optional<std::size_t> column(std::string_view header) const;
  [[nodiscard]] std::string_view cell(std::size_t row, std::size_t column) const;
  /// Line of a row in the file, counted from 1.
  [[nodiscard]] int line(std::size_t row) const { return lines_[row]; }
  /// The cell as a number (decimal comma understood where the file uses it). Empty cells, "NA",
  /// "n/a", "#N/A", "-" and "nan" are missing, not faults; anything else that is no number is a
  /// fault, and so is a number that may be read two ways (points among decimal commas).
  [[nodiscard]] std::optional<double> number(std::size_t row, std::size_t column,
                                             FaultList& faults) const;

 private:
  std::string name_;
  bool decimal_comma_ = false;
  std::vector<bool> has_comma_;  ///< per column: some number has a comma
  std::vector<bool> has_point_;  ///< per column: some number has a point
  std::vector<std::string> header_;
  std::vector<std::vector<std::string>> rows_;
  std::vector<int> lines_;
};

/// Quotes a cell for writing when it needs it (RFC 4180).
[[nodiscard]] std::string csv_cell(std::string_view text);
/// Shortest text that reads back to the same double.
[[nodiscard]] std::string csv_number(double value);

}  // namespace stillzone::core
