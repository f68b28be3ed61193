#include "core/csv_table.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <charconv>
#include <cmath>
#include <fstream>
#include <set>
#include <sstream>

namespace stillzone::core {
namespace {

std::string_view trimmed(std::string_view text) {
  const auto first = text.find_first_not_of(" \t");
  if (first == std::string_view::npos) return {};
  return text.substr(first, text.find_last_not_of(" \t") - first + 1);
}

/// Splits a text into rows of cells; quoted cells may hold separators and line ends (RFC 4180).
class CellScanner {
 public:
  CellScanner(std::string_view text, char separator) : text_(text), separator_(separator) {}

  /// The next row that is neither blank nor a comment; false at the end.
  bool next(std::vector<std::string>& cells, int& line) {
    while (at_ < text_.size()) {
      line = line_;
      const bool comment = text_[at_] == '#';
      read_row(cells);
      const bool blank = std::all_of(cells.begin(), cells.end(),
                                     [](const std::string& cell) { return cell.empty(); });
      if (!comment && !blank) return true;
    }
    return false;
  }

 private:
  void read_row(std::vector<std::string>& cells) {
    cells.clear();
    bool more = true;
    while (more) {
      std::string cell = read_cell();
      cells.push_back(std::move(cell));
      more = at_ < text_.size() && text_[at_] == separator_;
      if (more) ++at_;
    }
    if (at_ < text_.size() && text_[at_] == '\r') ++at_;
    if (at_ < text_.size() && text_[at_] == '\n') {
      ++at_;
      ++line_;
    }
  }

  std::string read_cell() {
    const std::size_t start = at_;
    while (at_ < text_.size() && (text_[at_] == ' ')) ++at_;
    if (at_ >= text_.size() || text_[at_] != '"') {
      at_ = start;
      const auto is_end = [&](char c) { return c == separator_ || c == '\n' || c == '\r'; };
      while (at_ < text_.size() && !is_end(text_[at_])) ++at_;
      return std::string(trimmed(text_.substr(start, at_ - start)));
    }
    std::string cell;
    for (++at_; at_ < text_.size(); ++at_) {
      if (text_[at_] == '"') {
        ++at_;
        if (at_ >= text_.size() || text_[at_] != '"') break;
      }
      line_ += text_[at_] == '\n' ? 1 : 0;
      cell += text_[at_];
    }
    while (at_ < text_.size() && text_[at_] == ' ') ++at_;
    return cell;
  }

  std::string_view text_;
  char separator_;
  std::size_t at_ = 0;
  int line_ = 1;
};

/// The separator that occurs most in the first line that is no comment, outside quotes.
char find_separator(std::string_view text) {
  while (!text.empty()) {
    const std::string_view line = text.substr(0, text.find('\n'));
    if (!trimmed(line).empty() && line.front() != '#') {
      std::array<std::pair<char, int>, 3> counts = {{{';', 0}, {'\t', 0}, {',', 0}}};
      bool quoted = false;
      for (const char c : line) {
        if (c == '"') quoted = !quoted;
        for (auto& [separator, n] : counts) n += !quoted && c == separator ? 1 : 0;
      }
      // A semicolon or tab decides; commas beside them are decimal commas.
      for (const auto& [separator, n] : counts) {
        if (n > 0) return separator;
      }
      return ',';
    }
    if (line.size() == text.size()) break;
    text.remove_prefix(line.size() + 1);
  }
  return ',';
}

bool looks_like_decimal_comma(std::string_view cell) {
  const auto comma = cell.find(',');
  if (comma == std::string_view::npos || cell.find('.') != std::string_view::npos) return false;
  return std::all_of(cell.begin(), cell.end(), [](char c) {
    return (c >= '0' && c <= '9') || c == ',' || c == '-' || c == '+' || c == 'e' || c == 'E';
  });
}

bool means_missing(std::string_view cell) {
  static constexpr std::array<std::string_view, 8> kWords = {"",  "NA",  "N/A", "n/a",
                                                             "-", "nan", "NaN", "--"};
  return std::find(kWords.begin(), kWords.end(), cell) != kWords.end();
}

}  // namespace

std::optional<CsvTable> CsvTable::parse(std::string_view text, std::string name,
                                        FaultList& faults) {
  CsvTable table;
  table.name_ = std::move(name);
  const auto refuse = [&](int line, std::string found, const char* allowed, const char* way_out) {
    faults.add({.file = table.name_,
                .line = line,
                .found = std::move(found),
                .allowed = allowed,
                .way_out = way_out});
  };
  if (text.substr(0, 3) == "\xEF\xBB\xBF") text.remove_prefix(3);
  if (text.substr(0, 2) == "\xFF\xFE" || text.substr(0, 2) == "\xFE\xFF") {
    refuse(1, "a UTF-16 file", "tables are read as UTF-8 text",
           "Export it again as \"CSV UTF-8\".");
    return std::nullopt;
  }
  const char separator = find_separator(text);
  CellScanner scanner(text, separator);
  int line = 0;
  if (!scanner.next(table.header_, line)) {
    refuse(0, "the table is empty", "the first row names the columns", "Check the export.");
    return std::nullopt;
  }
  std::set<std::string> seen;
  bool fine = true;
  for (const std::string& column : table.header_) {
    if (column.empty() || seen.insert(column).second) continue;
    refuse(line, fmt::format("column \"{}\" twice", column), "each column has its own name",
           "Rename one of the two.");
    fine = false;
  }
  std::vector<std::string> cells;
  while (scanner.next(cells, line)) {
    // Spreadsheets add empty cells at the end of rows.
    while (cells.size() > table.header_.size() && cells.back().empty()) cells.pop_back();
    if (cells.size() > table.header_.size()) {
      refuse(line, fmt::format("{} cells", cells.size()),
             fmt::format("the header names {} columns", table.header_.size()).c_str(),
             "Check for a stray separator or an unquoted text.");
      fine = false;
    }
    cells.resize(table.header_.size());
    for (const std::string& cell : cells) {
      table.decimal_comma_ = table.decimal_comma_ || looks_like_decimal_comma(cell);
    }
    table.rows_.push_back(cells);
    table.lines_.push_back(line);
  }
  if (fine && table.rows_.empty()) {
    refuse(0, "the table has a header and no rows", "at least one row is needed",
           "Check the export.");
    return std::nullopt;
  }
  if (separator == ',') table.decimal_comma_ = false;
  if (!fine) return std::nullopt;
  return table;
}

std::optional<CsvTable> CsvTable::read(const std::filesystem::path& path, FaultList& faults) {
  std::error_code error;
  std::ifstream file(path, std::ios::binary);
  if (!std::filesystem::is_regular_file(path, error) || !file) {
    faults.add({.file = path.string(),
                .found = std::filesystem::is_directory(path, error) ? "this is a folder"
                         : std::filesystem::exists(path, error)     ? "the file cannot be read"
                                                                    : "there is no such file",
                .allowed = "a table must exist and be readable",
                .way_out = "Paths in an input file start at that file's folder."});
    return std::nullopt;
  }
  std::ostringstream content;
  content << file.rdbuf();
  return parse(std::move(content).str(), path.string(), faults);
}

std::optional<std::size_t> CsvTable::column(std::string_view header) const {
  const auto found = std::find(header_.begin(), header_.end(), header);
  if (found == header_.end()) return std::nullopt;
  return static_cast<std::size_t>(found - header_.begin());
}

std::string_view CsvTable::cell(std::size_t row, std::size_t column) const {
  return rows_[row][column];
}

std::optional<double> CsvTable::number(std::size_t row, std::size_t column,
                                       FaultList& faults) const {
  std::string text(trimmed(cell(row, column)));
  if (means_missing(text)) return std::nullopt;
  if (decimal_comma_) std::replace(text.begin(), text.end(), ',', '.');
  const char* begin = text.data() + (text.front() == '+' ? 1 : 0);
  double value = 0.0;
  const auto [end, error] = std::from_chars(begin, text.data() + text.size(), value);
  if (error == std::errc() && end == text.data() + text.size() && std::isfinite(value)) {
    return value;
  }
  faults.add({.file = name_,
              .pointer = "column " + header_[column],
              .line = lines_[row],
              .found = fmt::format("\"{}\"", cell(row, column)),
              .allowed = "a number belongs here, or nothing where it is missing",
              .way_out = "Put units and remarks into the header or another column."});
  return std::nullopt;
}

std::string csv_cell(std::string_view text) {
  if (text.find_first_of(",;\t\"\r\n") == std::string_view::npos) return std::string(text);
  std::string quoted = "\"";
  for (const char c : text) {
    if (c == '"') quoted += '"';
    quoted += c;
  }
  return quoted + '"';
}

std::string csv_number(double value) { return fmt::format("{}", value); }

}  // namespace stillzone::core
