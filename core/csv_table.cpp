#include "core/csv_table.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <charconv>
#include <cmath>
#include <cstdint>
#include <fstream>
#include <set>
#include <sstream>

namespace stillzone::core {
namespace {

constexpr std::uintmax_t kLargest = std::uintmax_t{256} << 20U;  // bytes

std::string_view trimmed(std::string_view text) {
  const auto first = text.find_first_not_of(" \t");
  if (first == std::string_view::npos) return {};
  return text.substr(first, text.find_last_not_of(" \t") - first + 1);
}

/// What the quotes of a table can do wrong; the first of it and its line.
struct QuoteFault {
  int line = 0;  ///< 0: none
  bool open = false;
};

/// Splits a text into rows of cells; quoted cells may hold separators and line ends (RFC 4180).
class CellScanner {
 public:
  CellScanner(std::string_view text, char separator) : text_(text), separator_(separator) {}

  /// Passes over the rest of a line.
  void skip_line() {
    while (at_ < text_.size() && text_[at_] != '\n' && text_[at_] != '\r') ++at_;
    end_line();
  }

  /// The next row that is neither blank nor a comment; false at the end.
  bool next(std::vector<std::string>& cells, int& line) {
    while (at_ < text_.size()) {
      line = line_;
      if (text_[at_] == '#' && text_.substr(at_, 4) != "#N/A") {
        skip_line();
        continue;
      }
      read_row(cells);
      const bool blank = std::all_of(cells.begin(), cells.end(),
                                     [](const std::string& cell) { return cell.empty(); });
      if (!blank) return true;
    }
    return false;
  }
  [[nodiscard]] const QuoteFault& quote_fault() const { return quote_fault_; }

 private:
  /// Over one line end: CR LF, LF, or CR.
  void end_line() {
    const std::size_t start = at_;
    if (at_ < text_.size() && text_[at_] == '\r') ++at_;
    if (at_ < text_.size() && text_[at_] == '\n') ++at_;
    line_ += at_ > start ? 1 : 0;
  }

  void read_row(std::vector<std::string>& cells) {
    cells.clear();
    bool more = true;
    while (more) {
      std::string cell = read_cell();
      cells.push_back(std::move(cell));
      more = at_ < text_.size() && text_[at_] == separator_;
      if (more) ++at_;
    }
    end_line();
  }

  [[nodiscard]] bool at_cell_end() const {
    const char c = at_ < text_.size() ? text_[at_] : '\n';
    return c == separator_ || c == '\n' || c == '\r';
  }

  std::string read_cell() {
    const std::size_t start = at_;
    while (at_ < text_.size() && (text_[at_] == ' ')) ++at_;
    if (at_ >= text_.size() || text_[at_] != '"') {
      at_ = start;
      while (!at_cell_end()) ++at_;
      return std::string(trimmed(text_.substr(start, at_ - start)));
    }
    return read_quoted();
  }

  std::string read_quoted() {
    const int first_line = line_;
    std::string cell;
    bool closed = false;
    for (++at_; at_ < text_.size(); ++at_) {
      if (text_[at_] == '"') {
        ++at_;
        closed = at_ >= text_.size() || text_[at_] != '"';
        if (closed) break;
      }
      line_ += text_[at_] == '\n' ? 1 : 0;
      cell += text_[at_];
    }
    while (at_ < text_.size() && text_[at_] == ' ') ++at_;
    if ((!closed || !at_cell_end()) && quote_fault_.line == 0) quote_fault_ = {first_line, !closed};
    while (!at_cell_end()) ++at_;
    return cell;
  }

  std::string_view text_;
  char separator_;
  std::size_t at_ = 0;
  int line_ = 1;
  QuoteFault quote_fault_;
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

/// The separator of a first line "sep=;", as some spreadsheets write and read.
std::optional<char> stated_separator(std::string_view text) {
  const std::string_view line = text.substr(0, text.find_first_of("\r\n"));
  if (line.size() != 5 || line.substr(0, 4) != "sep=") return std::nullopt;
  if (std::string_view(";,\t").find(line.back()) == std::string_view::npos) return std::nullopt;
  return line.back();
}

/// Length of the UTF-8 character at the start of a text; 0 when there is none. Surrogates, overlong
/// forms and code points beyond U+10FFFF are none.
std::size_t utf8_length(std::string_view text) {
  const auto byte = [&](std::size_t i) { return static_cast<unsigned char>(text[i]); };
  const unsigned first = byte(0);
  if (first < 0x80U) return 1;
  const std::size_t n = first >= 0xF0U ? 4 : first >= 0xE0U ? 3 : 2;
  if (first < 0xC2U || first > 0xF4U || text.size() < n) return 0;
  for (std::size_t i = 1; i < n; ++i) {
    if ((byte(i) & 0xC0U) != 0x80U) return 0;
  }
  const unsigned second = byte(1);
  const bool wrong = (first == 0xE0U && second < 0xA0U) || (first == 0xEDU && second > 0x9FU) ||
                     (first == 0xF0U && second < 0x90U) || (first == 0xF4U && second > 0x8FU);
  return wrong ? 0 : n;
}

bool is_utf8(std::string_view text) {
  while (!text.empty()) {
    const std::size_t n = utf8_length(text);
    if (n == 0) return false;
    text.remove_prefix(n);
  }
  return true;
}

/// A text in Latin-1 (ISO 8859-1) as UTF-8.
std::string from_latin_1(std::string_view text) {
  std::string utf8;
  for (const char c : text) {
    const auto byte = static_cast<unsigned char>(c);
    if (byte < 0x80U) {
      utf8 += c;
    } else {
      utf8 += static_cast<char>(0xC0U | (byte >> 6U));
      utf8 += static_cast<char>(0x80U | (byte & 0x3FU));
    }
  }
  return utf8;
}

/// True for a number with the mark (',' or '.') as its only one.
bool is_number_with(char mark, std::string_view cell) {
  if (cell.find(mark) == std::string_view::npos) return false;
  return std::all_of(cell.begin(), cell.end(), [mark](char c) {
    return (c >= '0' && c <= '9') || c == mark || c == '-' || c == '+' || c == 'e' || c == 'E';
  });
}

/// "1.234": with decimal commas elsewhere this may be a thousand two hundred.
bool may_be_thousands(std::string_view cell) {
  const auto point = cell.find('.');
  return point != std::string_view::npos && cell.size() - point == 4 && point <= 3 &&
         is_number_with('.', cell);
}

bool means_missing(std::string_view cell) {
  static constexpr std::array<std::string_view, 9> kWords = {"",    "NA",  "N/A", "n/a", "-",
                                                             "nan", "NaN", "--",  "#N/A"};
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
  if (text.find('\0') != std::string_view::npos) {
    refuse(0, "bytes that are no text", "a table is UTF-8 text with a separator",
           "Export the sheet as \"CSV UTF-8\".");
    return std::nullopt;
  }
  const std::string converted = is_utf8(text) ? std::string() : from_latin_1(text);
  if (!converted.empty()) text = converted;
  const auto stated = stated_separator(text);
  const char separator = stated ? *stated : find_separator(text);
  CellScanner scanner(text, separator);
  if (stated) scanner.skip_line();
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
  table.has_comma_.resize(table.header_.size());
  table.has_point_.resize(table.header_.size());
  constexpr std::size_t kMostRagged = 5;
  std::size_t n_ragged = 0;
  std::vector<std::string> cells;
  while (scanner.next(cells, line)) {
    // Spreadsheets add empty cells at the end of rows.
    while (cells.size() > table.header_.size() && cells.back().empty()) cells.pop_back();
    if (cells.size() != table.header_.size()) {
      const bool more = cells.size() > table.header_.size();
      if (++n_ragged <= kMostRagged) {
        refuse(line, fmt::format("{} cell{}", cells.size(), cells.size() == 1 ? "" : "s"),
               fmt::format("the header names {} columns", table.header_.size()).c_str(),
               more ? "Check for a stray separator or an unquoted text."
                    : "Leave a missing cell empty, but write its separator.");
      }
      fine = false;
    }
    cells.resize(table.header_.size());
    for (std::size_t i = 0; i < cells.size(); ++i) {
      table.has_comma_[i] = table.has_comma_[i] || is_number_with(',', cells[i]);
      table.has_point_[i] = table.has_point_[i] || is_number_with('.', cells[i]);
    }
    table.rows_.push_back(std::move(cells));
    table.lines_.push_back(line);
  }
  if (n_ragged > kMostRagged) {
    refuse(0, fmt::format("{} more rows of the wrong length", n_ragged - kMostRagged),
           "every row has the cells the header names", "Check the separator of the export.");
  }
  if (const QuoteFault& quote = scanner.quote_fault(); quote.line > 0) {
    refuse(quote.line, quote.open ? "a quote that is never closed" : "text after a closing quote",
           "a quoted cell ends with its quote; a quote inside is doubled", "Check the quotes.");
    fine = false;
  }
  if (fine && table.rows_.empty()) {
    refuse(0, "the table has a header and no rows", "at least one row is needed",
           "Check the export.");
    return std::nullopt;
  }
  table.decimal_comma_ =
      separator != ',' &&
      std::find(table.has_comma_.begin(), table.has_comma_.end(), true) != table.has_comma_.end();
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
  if (std::filesystem::file_size(path, error) > kLargest) {
    faults.add({.file = path.string(),
                .found = "the file is larger than 256 MiB",
                .allowed = "a table is at most that",
                .way_out = "Thin it out: a row a minute is plenty."});
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
  const auto refuse = [&](const char* allowed, const char* way_out) {
    faults.add({.file = name_,
                .pointer = "column " + header_[column],
                .line = lines_[row],
                .found = fmt::format("\"{}\"", cell(row, column)),
                .allowed = allowed,
                .way_out = way_out});
  };
  if (decimal_comma_ && ((has_comma_[column] && has_point_[column]) || may_be_thousands(text))) {
    refuse("this table has decimal commas, so a point may be a decimal or a thousands mark",
           "Export it again with one decimal mark and no thousands separators.");
    return std::nullopt;
  }
  if (decimal_comma_) std::replace(text.begin(), text.end(), ',', '.');
  const char* begin = text.data() + (text.front() == '+' ? 1 : 0);
  double value = 0.0;
  const auto [end, error] = std::from_chars(begin, text.data() + text.size(), value);
  if (error == std::errc() && end == text.data() + text.size() && std::isfinite(value)) {
    return value;
  }
  if (!decimal_comma_ && is_number_with(',', text)) {
    refuse("this table has no decimal commas, so a comma may be a decimal or a thousands mark",
           "Export it again with decimal points, or with semicolons between the columns.");
    return std::nullopt;
  }
  refuse("a number belongs here, or nothing where it is missing",
         "Put units and remarks into the header or another column.");
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
