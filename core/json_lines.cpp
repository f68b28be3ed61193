#include "core/json_lines.hpp"

#include <fmt/format.h>

#include <cctype>
#include <charconv>
#include <cmath>
#include <unordered_map>

namespace stillzone::core {
namespace {

constexpr int kDeepest = 64;
constexpr std::size_t kLongestKey = 200;
/// Below pointers longer than this, lines are those of the parent: keeps the memory linear.
constexpr std::size_t kLongestPointer = 1000;

void append_utf8(std::string& text, unsigned code) {
  const auto put = [&](unsigned byte) { text += static_cast<char>(byte); };
  if (code < 0x80) {
    put(code);
  } else if (code < 0x800) {
    put(0xC0U | (code >> 6U));
    put(0x80U | (code & 0x3FU));
  } else if (code < 0x10000) {
    put(0xE0U | (code >> 12U));
    put(0x80U | ((code >> 6U) & 0x3FU));
    put(0x80U | (code & 0x3FU));
  } else {
    put(0xF0U | (code >> 18U));
    put(0x80U | ((code >> 12U) & 0x3FU));
    put(0x80U | ((code >> 6U) & 0x3FU));
    put(0x80U | (code & 0x3FU));
  }
}

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

  /// The four hexadecimal digits after \u; 0 where there are none (the parser will complain).
  unsigned hexadecimal() {
    unsigned code = 0;
    const std::string_view digits = text_.substr(at_, 4);
    const auto [end, error] =
        std::from_chars(digits.data(), digits.data() + digits.size(), code, 16);
    if (error != std::errc() || end != digits.data() + 4) return 0;
    at_ += 4;
    return code;
  }

  /// What a backslash and the character here stand for.
  void unescape(std::string& result) {
    const char c = peek();
    step();
    switch (c) {
      case 'b':
        result += '\b';
        return;
      case 'f':
        result += '\f';
        return;
      case 'n':
        result += '\n';
        return;
      case 'r':
        result += '\r';
        return;
      case 't':
        result += '\t';
        return;
      case 'u':
        break;
      default:
        result += c;
        return;
    }
    unsigned code = hexadecimal();
    if (code >= 0xD800 && code < 0xDC00 && text_.substr(at_, 2) == "\\u") {
      at_ += 2;
      code = 0x10000U + ((code - 0xD800U) << 10U) + ((hexadecimal() - 0xDC00U) & 0x3FFU);
    }
    append_utf8(result, code);
  }

  /// The text of a string, escapes undone.
  std::string string() {
    std::string result;
    step();
    while (!at_end() && peek() != '"') {
      const bool escape = peek() == '\\';
      if (!escape) result += peek();
      step();
      if (escape && !at_end()) unescape(result);
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
    if (pointer.size() <= kLongestPointer) lines_.line_of.emplace(pointer, line_);
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
      word(pointer);
    }
  }

  /// A number, true, false, null; or what cannot be a value: NaN, Infinity, 1e999.
  void word(const std::string& pointer) {
    const std::size_t start = at_;
    const int start_column = column();
    while (!at_end() && std::string_view(",]}/ \t\r\n").find(peek()) == std::string_view::npos) {
      step();
    }
    std::string_view written = text_.substr(start, at_ - start);
    double value = 0.0;
    const auto [end, error] =
        std::from_chars(written.data(), written.data() + written.size(), value);
    if (end != written.data() + written.size()) return;
    // Also "inf", "nan", "Infinity": from_chars knows them, JSON does not. 1e-400 reads as 0.
    const bool tiny = written.find("e-") != written.npos || written.find("E-") != written.npos;
    const bool out_of_range = error == std::errc::result_out_of_range && !tiny;
    if (!out_of_range && (error != std::errc() || std::isfinite(value))) return;
    constexpr std::size_t kShown = 40;
    if (written.size() > kShown) written = written.substr(0, kShown);
    lines_.problems.push_back({.line = line_,
                               .column = start_column,
                               .pointer = pointer,
                               .found = std::string(written),
                               .allowed = "a number must be finite",
                               .way_out = "Give a number between -1e308 and 1e308."});
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
    std::unordered_map<std::string, int> keys;
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
      if (key.size() > kLongestKey) {
        problem(pointer, fmt::format("a key of {} characters", key.size()),
                fmt::format("a key has at most {}", kLongestKey), "Check the quotes.");
        stopped_ = true;
        return;
      }
      const std::string place = pointer + "/" + pointer_escaped(key);
      if (const auto [first, fresh] = keys.emplace(key, key_line); !fresh) {
        problem(place, fmt::format("key \"{}\" for the second time", key),
                fmt::format("each key stands once; the first is on line {}", first->second),
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
      if (place.size() <= kLongestPointer) lines_.line_of.emplace(place, key_line);
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
