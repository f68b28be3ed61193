#include "core/json_lines.hpp"

#include <fmt/format.h>

#include <cctype>
#include <unordered_set>

namespace stillzone::core {
namespace {

constexpr int kDeepest = 64;

class Scanner {
 public:
  explicit Scanner(std::string_view text) : text_(text) {}

  JsonLines scan() {
    skip_blank();
    if (!at_end()) value("", 0);
    return std::move(lines_);
  }

 private:
  [[nodiscard]] bool at_end() const { return stopped_ || at_ >= text_.size(); }
  [[nodiscard]] char peek() const { return text_[at_]; }
  void step() {
    if (text_[at_] == '\n') {
      ++line_;
      line_start_ = at_ + 1;
    }
    ++at_;
  }
  [[nodiscard]] int column() const { return static_cast<int>(at_ - line_start_) + 1; }

  void skip_blank() {
    while (!at_end()) {
      if (std::isspace(static_cast<unsigned char>(peek())) != 0) {
        step();
      } else if (text_.substr(at_, 2) == "//") {
        while (!at_end() && peek() != '\n') step();
      } else if (text_.substr(at_, 2) == "/*") {
        while (!at_end() && text_.substr(at_, 2) != "*/") step();
        for (int k = 0; k < 2 && !at_end(); ++k) step();
      } else {
        return;
      }
    }
  }

  /// The raw text of a string, escapes undone as far as keys need it.
  std::string string() {
    std::string result;
    step();
    while (!at_end() && peek() != '"') {
      if (peek() == '\\') {
        step();
        if (at_end()) break;
      }
      result += peek();
      step();
    }
    if (at_end()) {
      stopped_ = true;
    } else {
      step();
    }
    return result;
  }

  void problem(const std::string& pointer, std::string found, std::string allowed,
               std::string way_out) {
    lines_.problems.push_back({.line = line_,
                               .column = column(),
                               .pointer = pointer,
                               .found = std::move(found),
                               .allowed = std::move(allowed),
                               .way_out = std::move(way_out)});
  }

  void value(const std::string& pointer, int depth) {
    lines_.line_of.emplace(pointer, line_);
    if (depth > kDeepest) {
      problem(pointer, fmt::format("nesting deeper than {}", kDeepest),
              fmt::format("at most {} levels are read", kDeepest), "Check the brackets.");
      stopped_ = true;
      return;
    }
    const char first = peek();
    if (first == '{') {
      object(pointer, depth);
    } else if (first == '[') {
      array(pointer, depth);
    } else if (first == '"') {
      (void)string();
    } else {
      while (!at_end() && std::string_view(",]}/ \t\r\n").find(peek()) == std::string_view::npos) {
        step();
      }
    }
  }

  /// After a member or element: true when another may follow.
  bool comma(const std::string& pointer, char end) {
    skip_blank();
    if (at_end() || peek() != ',') return false;
    const int line = line_;
    const int comma_column = column();
    step();
    skip_blank();
    if (!at_end() && peek() == end) {
      lines_.problems.push_back(
          {.line = line,
           .column = comma_column,
           .pointer = pointer,
           .found = fmt::format("a comma before the closing \"{}\"", end),
           .allowed = "the last entry has no comma after it",
           .way_out = fmt::format("Take the comma in column {} out.", comma_column)});
      return false;
    }
    return true;
  }

  void close(char end) {
    skip_blank();
    if (at_end() || peek() != end) {
      stopped_ = true;
      return;
    }
    step();
  }

  void object(const std::string& pointer, int depth) {
    std::unordered_set<std::string> keys;
    step();
    skip_blank();
    bool more = !at_end() && peek() != '}';
    while (more && !at_end()) {
      skip_blank();
      if (at_end() || peek() != '"') {
        stopped_ = true;
        return;
      }
      const int key_line = line_;
      const std::string key = string();
      const std::string place = pointer + "/" + pointer_escaped(key);
      if (!keys.insert(key).second) {
        problem(
            place, fmt::format("key \"{}\" for the second time", key),
            fmt::format("each key stands once; the first is on line {}", lines_.line_of.at(place)),
            "Take one of the two out.");
        lines_.problems.back().line = key_line;
      }
      skip_blank();
      if (at_end() || peek() != ':') {
        stopped_ = true;
        return;
      }
      step();
      skip_blank();
      if (at_end()) return;
      lines_.line_of.emplace(place, key_line);
      value(place, depth + 1);
      more = comma(place, '}');
    }
    close('}');
  }

  void array(const std::string& pointer, int depth) {
    step();
    skip_blank();
    bool more = !at_end() && peek() != ']';
    for (int i = 0; more && !at_end(); ++i) {
      skip_blank();
      if (at_end()) return;
      const std::string place = fmt::format("{}/{}", pointer, i);
      value(place, depth + 1);
      more = comma(place, ']');
    }
    close(']');
  }

  std::string_view text_;
  std::size_t at_ = 0;
  int line_ = 1;
  std::size_t line_start_ = 0;
  bool stopped_ = false;
  JsonLines lines_;
};

}  // namespace

JsonLines scan_json_lines(std::string_view text) { return Scanner(text).scan(); }

std::string pointer_escaped(std::string_view key) {
  std::string escaped;
  for (const char c : key) {
    if (c == '~') {
      escaped += "~0";
    } else if (c == '/') {
      escaped += "~1";
    } else {
      escaped += c;
    }
  }
  return escaped;
}

}  // namespace stillzone::core
