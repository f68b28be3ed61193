#pragma once

#include <string>
#include <vector>

namespace stillzone::cli {

/// A table for people: columns as wide as they need, numbers to the right, words to the left.
class TextTable {
 public:
  enum class Align { left, right };
  void column(std::string header, Align align = Align::right);
  /// As many cells as columns.
  void row(std::vector<std::string> cells);
  [[nodiscard]] bool empty() const { return rows_.empty(); }
  /// Indented by two blanks, a rule under the header.
  [[nodiscard]] std::string text() const;

 private:
  std::vector<std::string> headers_;
  std::vector<Align> aligns_;
  std::vector<std::vector<std::string>> rows_;
};

/// Four significant digits, as a person writes them: 0.1976, 2956, 1.2e-07; "0" for 0.
[[nodiscard]] std::string short_number(double value);
/// A share in percent: 0.153 -> "15.3 %".
[[nodiscard]] std::string percent(double share);

}  // namespace stillzone::cli
