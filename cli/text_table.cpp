#include "cli/text_table.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <utility>

#include "core/require.hpp"

namespace stillzone::cli {
namespace {

/// Characters a text takes on screen: UTF-8 continuation bytes take none.
std::size_t width(const std::string& text) {
  return static_cast<std::size_t>(std::count_if(text.begin(), text.end(), [](char c) {
    return (static_cast<unsigned char>(c) & 0xC0U) != 0x80U;
  }));
}

std::string padded(const std::string& text, std::size_t size, TextTable::Align align) {
  const std::string blanks(size > width(text) ? size - width(text) : 0, ' ');
  return align == TextTable::Align::left ? text + blanks : blanks + text;
}

}  // namespace

void TextTable::column(std::string header, Align align) {
  headers_.push_back(std::move(header));
  aligns_.push_back(align);
}

void TextTable::row(std::vector<std::string> cells) {
  SZ_REQUIRE(cells.size() == headers_.size(), "{} cells, {} columns", cells.size(),
             headers_.size());
  rows_.push_back(std::move(cells));
}

std::string TextTable::text() const {
  std::vector<std::size_t> widths;
  for (std::size_t j = 0; j < headers_.size(); ++j) {
    std::size_t widest = width(headers_[j]);
    for (const auto& cells : rows_) widest = std::max(widest, width(cells[j]));
    widths.push_back(widest);
  }
  const auto line = [&](const std::vector<std::string>& cells) {
    std::string result = " ";
    for (std::size_t j = 0; j < cells.size(); ++j) {
      result += " " + padded(cells[j], widths[j], aligns_[j]) + (j + 1 < cells.size() ? " " : "");
    }
    while (!result.empty() && result.back() == ' ') result.pop_back();
    return result + "\n";
  };
  std::string result = line(headers_);
  std::vector<std::string> rules;
  for (const std::size_t size : widths) rules.emplace_back(size, '-');
  result += line(rules);
  for (const auto& cells : rows_) result += line(cells);
  return result;
}

std::string short_number(double value) {
  if (!(std::abs(value) > 0.0)) return "0";
  return fmt::format("{:.4g}", value);
}

std::string percent(double share) { return fmt::format("{:.1f} %", 100.0 * share); }

}  // namespace stillzone::cli
