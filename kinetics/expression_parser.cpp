#include "kinetics/expression_parser.hpp"

#include <fmt/format.h>

#include <array>
#include <charconv>
#include <cmath>
#include <system_error>
#include <vector>

#include "core/near_name.hpp"

namespace stillzone::kinetics {

namespace {

constexpr std::size_t kMaxLength = 4096;
constexpr int kMaxNesting = 64;

struct Function {
  std::string_view name;
  std::size_t n_arguments;
  std::string_view form;
};

constexpr std::array<Function, 9> kFunctions{{{"exp", 1, "exp(x)"},
                                              {"log", 1, "log(x)"},
                                              {"log10", 1, "log10(x)"},
                                              {"sqrt", 1, "sqrt(x)"},
                                              {"min", 2, "min(x, y)"},
                                              {"max", 2, "max(x, y)"},
                                              {"monod", 2, "monod(s, k)"},
                                              {"inhibition", 2, "inhibition(i, k)"},
                                              {"hill", 3, "hill(x, k, n)"}}};

const Function* find_function(std::string_view name) {
  for (const Function& function : kFunctions) {
    if (function.name == name) return &function;
  }
  return nullptr;
}

std::string function_hint(std::string_view name) {
  std::vector<std::string> names;
  for (const Function& function : kFunctions) names.emplace_back(function.name);
  return core::name_hint(name, names);
}

bool is_digit(char c) { return c >= '0' && c <= '9'; }
bool is_name_start(char c) { return (c >= 'a' && c <= 'z') || (c >= 'A' && c <= 'Z') || c == '_'; }
bool is_name_part(char c) { return is_name_start(c) || is_digit(c); }
bool is_space(char c) { return c == ' ' || c == '\t' || c == '\n' || c == '\r'; }
bool is_continuation_byte(char c) { return (static_cast<unsigned char>(c) & 0xC0U) == 0x80U; }

/// Recursive descent, one function per level of the grammar. Every function returns nothing after
/// the first error, which stays in `error_`.
class Parser {
 public:
  Parser(std::string_view text, ExpressionGraph& graph, const NameLookup& lookup,
         const NameSuggestion& suggestion)
      : text_(text), graph_(graph), lookup_(lookup), suggestion_(suggestion) {}

  std::variant<NodeId, ExpressionError> parse() {
    if (text_.size() > kMaxLength) {
      return ExpressionError{
          kMaxLength + 1,
          fmt::format("the expression is {} characters long; at most {} are allowed", text_.size(),
                      kMaxLength),
          "Move parts of it into named terms."};
    }
    skip_space();
    if (at_end()) {
      return ExpressionError{1, "the expression is empty", "Write a number, a name or a formula."};
    }
    const auto root = sum();
    if (root && !at_end()) fail_on_leftover();
    if (error_) return *error_;
    return *root;
  }

 private:
  using MaybeNode = std::optional<NodeId>;

  /// Counts one level of parentheses, function arguments or exponents.
  class Level {
   public:
    explicit Level(int& depth) : depth_(depth) { ++depth_; }
    ~Level() { --depth_; }
    Level(const Level&) = delete;
    Level& operator=(const Level&) = delete;

   private:
    int& depth_;
  };

  [[nodiscard]] bool at_end() const { return at_ >= text_.size(); }
  [[nodiscard]] char peek(std::size_t ahead = 0) const {
    return at_ + ahead < text_.size() ? text_[at_ + ahead] : '\0';
  }
  void skip_space() {
    while (!at_end() && is_space(text_[at_])) ++at_;
  }
  void advance() {
    ++at_;
    skip_space();
  }

  MaybeNode fail(std::size_t byte, std::string problem, std::string way_out) {
    if (!error_) {
      std::size_t position = 1;  // characters, not bytes
      for (std::size_t i = 0; i < byte; ++i) {
        if (!is_continuation_byte(text_[i])) ++position;
      }
      error_ = ExpressionError{position, std::move(problem), std::move(way_out)};
    }
    return std::nullopt;
  }

  /// The whole character at a byte, for messages.
  [[nodiscard]] std::string character(std::size_t byte) const {
    std::size_t end = byte + 1;
    while (end < text_.size() && end < byte + 4 && is_continuation_byte(text_[end])) ++end;
    const auto first = static_cast<unsigned char>(text_[byte]);
    const std::size_t expected = first < 0x80U   ? 1
                                 : first < 0xC2U ? 0
                                 : first < 0xE0U ? 2
                                 : first < 0xF0U ? 3
                                 : first < 0xF5U ? 4
                                                 : 0;
    if (first < 0x20U || first == 0x7FU || expected != end - byte) {
      return fmt::format("byte 0x{:02X}", first);
    }
    return fmt::format("\"{}\"", text_.substr(byte, end - byte));
  }

  [[nodiscard]] bool too_deep() {
    if (depth_ <= kMaxNesting) return false;
    fail(at_, fmt::format("the expression is nested more than {} levels deep", kMaxNesting),
         "Move parts of it into named terms.");
    return true;
  }

  MaybeNode sum();
  MaybeNode product();
  MaybeNode signed_power();
  MaybeNode power();
  MaybeNode primary();
  MaybeNode parenthesis();
  MaybeNode number();
  MaybeNode name();
  MaybeNode call(const Function& function, std::size_t start);
  MaybeNode apply(const Function& function, const std::vector<NodeId>& arguments);
  MaybeNode fail_on_missing_value();
  void fail_on_leftover();

  std::string_view text_;
  ExpressionGraph& graph_;
  const NameLookup& lookup_;
  const NameSuggestion& suggestion_;
  std::size_t at_ = 0;
  int depth_ = 0;
  std::string last_operator_;  ///< what stands before a missing value
  std::optional<ExpressionError> error_;
};

Parser::MaybeNode Parser::sum() {
  auto left = product();
  while (left && (peek() == '+' || peek() == '-')) {
    const char op = peek();
    last_operator_ = op;
    advance();
    const auto right = product();
    if (!right) return std::nullopt;
    left = op == '+' ? graph_.add(*left, *right) : graph_.subtract(*left, *right);
  }
  return left;
}

Parser::MaybeNode Parser::product() {
  auto left = signed_power();
  while (left && (peek() == '*' || peek() == '/')) {
    const char op = peek();
    if (op == '*' && peek(1) == '*') {
      return fail(at_, "\"**\" is no operator", "Write ^ for a power.");
    }
    last_operator_ = op;
    advance();
    const auto right = signed_power();
    if (!right) return std::nullopt;
    left = op == '*' ? graph_.multiply(*left, *right) : graph_.divide(*left, *right);
  }
  return left;
}

Parser::MaybeNode Parser::signed_power() {
  bool negative = false;
  while (peek() == '-' || peek() == '+') {
    if (peek() == '-') negative = !negative;
    last_operator_ = peek();
    advance();
  }
  const auto value = power();
  if (!value) return std::nullopt;
  return negative ? graph_.negate(*value) : *value;
}

Parser::MaybeNode Parser::power() {
  const auto base = primary();
  if (!base || peek() != '^') return base;
  last_operator_ = "^";
  advance();
  const Level level(depth_);
  if (too_deep()) return std::nullopt;
  const auto exponent = signed_power();  // to the right first: a^b^c = a^(b^c)
  if (!exponent) return std::nullopt;
  return graph_.power(*base, *exponent);
}

Parser::MaybeNode Parser::primary() {
  if (at_end()) return fail_on_missing_value();
  const char c = peek();
  if (c == '(') return parenthesis();
  if (is_digit(c) || (c == '.' && is_digit(peek(1)))) return number();
  if (is_name_start(c)) return name();
  return fail_on_missing_value();
}

Parser::MaybeNode Parser::fail_on_missing_value() {
  const std::string after =
      last_operator_.empty() ? "" : fmt::format(" after \"{}\"", last_operator_);
  const std::string way_out = "Write a number, a name or a \"(\" here.";
  if (at_end()) {
    return fail(at_, fmt::format("the expression ends where a value is missing{}", after), way_out);
  }
  const char c = peek();
  if (c == '*' && last_operator_ == "*") {
    return fail(at_, "\"**\" is no operator", "Write ^ for a power.");
  }
  if (c == ')' || c == '*' || c == '/' || c == '^' || c == ',') {
    return fail(at_, fmt::format("a value is missing{} before \"{}\"", after, c), way_out);
  }
  return fail(at_, fmt::format("{} cannot stand in an expression", character(at_)),
              "Allowed are numbers, names, + - * / ^ ( ) and the commas between arguments.");
}

Parser::MaybeNode Parser::parenthesis() {
  const std::size_t start = at_;
  const Level level(depth_);
  if (too_deep()) return std::nullopt;
  last_operator_ = "(";
  advance();
  const auto inner = sum();
  if (!inner) return std::nullopt;
  if (at_end()) {
    return fail(start, "this \"(\" is never closed", "Add the missing \")\".");
  }
  if (peek() != ')') {
    fail_on_leftover();
    return std::nullopt;
  }
  advance();
  return inner;
}

Parser::MaybeNode Parser::number() {
  const std::size_t start = at_;
  while (is_digit(peek())) ++at_;
  if (peek() == '.') ++at_;
  while (is_digit(peek())) ++at_;
  if (peek() == 'e' || peek() == 'E') {
    const std::size_t sign = peek(1) == '+' || peek(1) == '-' ? 1 : 0;
    if (is_digit(peek(1 + sign))) {
      at_ += 1 + sign;
      while (is_digit(peek())) ++at_;
    } else if (!is_name_part(peek(1))) {
      return fail(start,
                  fmt::format("the number \"{}\" has no digits in its exponent",
                              text_.substr(start, at_ + 1 + sign - start)),
                  "Write it like 1e-6.");
    }
  }
  const std::string_view digits = text_.substr(start, at_ - start);
  double value = 0.0;
  const auto [end, code] = std::from_chars(digits.data(), digits.data() + digits.size(), value);
  if (code != std::errc() || end != digits.data() + digits.size() || !std::isfinite(value)) {
    return fail(start, fmt::format("the number \"{}\" is out of range", digits),
                "Magnitudes from 2.3e-308 to 1.7e308 can be computed with.");
  }
  if (peek() == '.') {
    return fail(at_, fmt::format("a second decimal point follows the number \"{}\"", digits),
                "A number has one decimal point: 1.5.");
  }
  if (is_name_start(peek())) {
    return fail(at_, fmt::format("an operator is missing after the number \"{}\"", digits),
                "Write * for a product: 2 * x.");
  }
  skip_space();
  return graph_.constant(value);
}

Parser::MaybeNode Parser::name() {
  const std::size_t start = at_;
  while (is_name_part(peek())) ++at_;
  const std::string_view word = text_.substr(start, at_ - start);
  skip_space();
  const Function* function = find_function(word);
  if (peek() == '(') {
    if (function != nullptr) return call(*function, start);
    if (lookup_ && lookup_(word)) {
      return fail(at_, fmt::format("\"{}\" is a quantity, not a function", word),
                  "Write * for a product: x * (...).");
    }
    return fail(start, fmt::format("unknown function \"{}\"", word), function_hint(word));
  }
  const auto node = lookup_ ? lookup_(word) : std::nullopt;
  if (node) return node;
  if (function != nullptr) {
    return fail(start, fmt::format("the function \"{}\" has no arguments", word),
                fmt::format("Write {}.", function->form));
  }
  return fail(start, fmt::format("unknown name \"{}\"", word),
              suggestion_ ? suggestion_(word) : std::string());
}

Parser::MaybeNode Parser::call(const Function& function, std::size_t start) {
  const std::size_t open = at_;
  const Level level(depth_);
  if (too_deep()) return std::nullopt;
  last_operator_ = "(";
  advance();
  std::vector<NodeId> arguments;
  if (peek() != ')') {
    for (;;) {
      const auto argument = sum();
      if (!argument) return std::nullopt;
      arguments.push_back(*argument);
      if (peek() != ',') break;
      last_operator_ = ",";
      advance();
    }
  }
  if (at_end()) {
    return fail(open, fmt::format("the \"(\" of \"{}\" is never closed", function.name),
                "Add the missing \")\".");
  }
  if (peek() != ')') {
    fail_on_leftover();
    return std::nullopt;
  }
  if (arguments.size() != function.n_arguments) {
    return fail(
        start,
        fmt::format("\"{}\" takes {} argument{}, not {}", function.name, function.n_arguments,
                    function.n_arguments == 1 ? "" : "s", arguments.size()),
        fmt::format("Write {}.", function.form));
  }
  advance();
  return apply(function, arguments);
}

Parser::MaybeNode Parser::apply(const Function& function, const std::vector<NodeId>& arguments) {
  ExpressionGraph& g = graph_;
  const NodeId x = arguments[0];
  if (function.name == "exp") return g.exp(x);
  if (function.name == "log") return g.log(x);
  if (function.name == "log10") return g.divide(g.log(x), g.log(g.constant(10.0)));
  if (function.name == "sqrt") return g.sqrt(x);
  const NodeId y = arguments[1];
  if (function.name == "min") return g.minimum(x, y);
  if (function.name == "max") return g.maximum(x, y);
  if (function.name == "monod") return g.divide(x, g.add(y, x));
  const NodeId one = g.constant(1.0);
  if (function.name == "inhibition") return g.divide(one, g.add(one, g.divide(x, y)));
  const NodeId n = arguments[2];  // hill
  const NodeId threshold = g.power(y, n);
  return g.divide(threshold, g.add(threshold, g.power(x, n)));
}

/// A value is complete and what follows cannot follow a value.
void Parser::fail_on_leftover() {
  const char c = peek();
  if (c == ')') {
    fail(at_, "this \")\" closes nothing", "Remove it, or add the missing \"(\".");
  } else if (c == ',') {
    fail(at_, "a comma stands outside the arguments of a function",
         "Write decimals with a point: 1.5.");
  } else if (is_name_part(c) || c == '(' || c == '.') {
    fail(at_, fmt::format("an operator is missing before {}", character(at_)),
         "Write * for a product: a * b.");
  } else {
    fail(at_, fmt::format("{} cannot stand in an expression", character(at_)),
         "Allowed are numbers, names, + - * / ^ ( ) and the commas between arguments.");
  }
}

}  // namespace

std::variant<NodeId, ExpressionError> parse_expression(std::string_view text,
                                                       ExpressionGraph& graph,
                                                       const NameLookup& lookup,
                                                       const NameSuggestion& suggestion) {
  return Parser(text, graph, lookup, suggestion).parse();
}

}  // namespace stillzone::kinetics
