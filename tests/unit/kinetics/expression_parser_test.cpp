#include "kinetics/expression_parser.hpp"

#include <gtest/gtest.h>

#include <cmath>
#include <map>
#include <string>
#include <vector>

namespace stillzone::kinetics {
namespace {

const std::map<std::string, std::size_t, std::less<>> kNames{
    {"x", 0}, {"y", 1}, {"S_ac", 2}, {"K_S", 3}};

struct Parsed {
  ExpressionGraph graph;
  std::variant<NodeId, ExpressionError> result;
};

Parsed parse(std::string_view text) {
  Parsed parsed;
  const NameLookup lookup = [&](std::string_view name) -> std::optional<NodeId> {
    const auto found = kNames.find(name);
    if (found == kNames.end()) return std::nullopt;
    return parsed.graph.input(found->second);
  };
  const NameSuggestion suggestion = [](std::string_view name) {
    return name == "S_acc" ? std::string("Did you mean \"S_ac\"?") : std::string();
  };
  parsed.result = parse_expression(text, parsed.graph, lookup, suggestion);
  return parsed;
}

constexpr double kX = 1.7, kY = 0.3, kSac = 0.2, kKs = 0.15;

double value(std::string_view text) {
  const Parsed parsed = parse(text);
  const auto* node = std::get_if<NodeId>(&parsed.result);
  if (node == nullptr) {
    ADD_FAILURE() << text << ": " << std::get<ExpressionError>(parsed.result).problem;
    return std::nan("");
  }
  const std::vector<double> inputs{kX, kY, kSac, kKs};
  return parsed.graph.evaluate(*node, inputs);
}

void expect_error(std::string_view text, std::size_t position, const std::string& problem,
                  const std::string& way_out) {
  const Parsed parsed = parse(text);
  const auto* error = std::get_if<ExpressionError>(&parsed.result);
  ASSERT_NE(error, nullptr) << text;
  EXPECT_EQ(error->position, position) << text;
  EXPECT_EQ(error->problem, problem) << text;
  EXPECT_EQ(error->way_out, way_out) << text;
}

const std::string kWriteValue = "Write a number, a name or a \"(\" here.";
const std::string kAllowed =
    "Allowed are numbers, names, + - * / ^ ( ) and the commas between arguments.";

TEST(ExpressionParser, FollowsTheOrderOfOperations) {
  EXPECT_DOUBLE_EQ(value("1 + 2 * 3"), 7.0);
  EXPECT_DOUBLE_EQ(value("(1 + 2) * 3"), 9.0);
  EXPECT_DOUBLE_EQ(value("8 - 3 - 2"), 3.0);
  EXPECT_DOUBLE_EQ(value("8 / 4 / 2"), 1.0);
  EXPECT_DOUBLE_EQ(value("x - y * x"), kX - kY * kX);
}

TEST(ExpressionParser, PowerIsRightAssociative) { EXPECT_DOUBLE_EQ(value("2 ^ 3 ^ 2"), 512.0); }

TEST(ExpressionParser, PowerBindsTighterThanUnaryMinus) {
  EXPECT_DOUBLE_EQ(value("-2 ^ 2"), -4.0);
  EXPECT_DOUBLE_EQ(value("2 ^ -2"), 0.25);
  EXPECT_DOUBLE_EQ(value("-x ^ 2"), -kX * kX);
  EXPECT_DOUBLE_EQ(value("- - + 3"), 3.0);
  EXPECT_DOUBLE_EQ(value("2 * -3"), -6.0);
}

TEST(ExpressionParser, ReadsEveryFormOfNumber) {
  EXPECT_DOUBLE_EQ(value("1"), 1.0);
  EXPECT_DOUBLE_EQ(value("0.5"), 0.5);
  EXPECT_DOUBLE_EQ(value(".5"), 0.5);
  EXPECT_DOUBLE_EQ(value("5."), 5.0);
  EXPECT_DOUBLE_EQ(value("1e-6"), 1e-6);
  EXPECT_DOUBLE_EQ(value("1.25E+3"), 1250.0);
  EXPECT_DOUBLE_EQ(value(" \t\n7 "), 7.0);
}

TEST(ExpressionParser, KnowsTheFunctionsOfTheHeader) {
  EXPECT_DOUBLE_EQ(value("exp(x)"), std::exp(kX));
  EXPECT_DOUBLE_EQ(value("log(x)"), std::log(kX));
  EXPECT_DOUBLE_EQ(value("log10(x)"), std::log10(kX));
  EXPECT_DOUBLE_EQ(value("sqrt(x)"), std::sqrt(kX));
  EXPECT_DOUBLE_EQ(value("min(x, y)"), kY);
  EXPECT_DOUBLE_EQ(value("max(x, y)"), kX);
  EXPECT_DOUBLE_EQ(value("monod(S_ac, K_S)"), kSac / (kKs + kSac));
  EXPECT_DOUBLE_EQ(value("inhibition(S_ac, K_S)"), 1.0 / (1.0 + kSac / kKs));
  EXPECT_DOUBLE_EQ(value("hill(x, y, 2.5)"),
                   std::pow(kY, 2.5) / (std::pow(kY, 2.5) + std::pow(kX, 2.5)));
  EXPECT_DOUBLE_EQ(value("10 ^ (-x)"), std::pow(10.0, -kX));
}

TEST(ExpressionParser, NamesWhatIsMissingAndWhere) {
  expect_error("", 1, "the expression is empty", "Write a number, a name or a formula.");
  expect_error("   ", 1, "the expression is empty", "Write a number, a name or a formula.");
  expect_error("1 +", 4, "the expression ends where a value is missing after \"+\"", kWriteValue);
  expect_error("-", 2, "the expression ends where a value is missing after \"-\"", kWriteValue);
  expect_error("(", 2, "the expression ends where a value is missing after \"(\"", kWriteValue);
  expect_error("()", 2, "a value is missing after \"(\" before \")\"", kWriteValue);
  expect_error("* x", 1, "a value is missing before \"*\"", kWriteValue);
  expect_error("x + * y", 5, "a value is missing after \"+\" before \"*\"", kWriteValue);
  expect_error("x ^", 4, "the expression ends where a value is missing after \"^\"", kWriteValue);
  expect_error("min(x,)", 7, "a value is missing after \",\" before \")\"", kWriteValue);
  expect_error("exp(", 5, "the expression ends where a value is missing after \"(\"", kWriteValue);
}

TEST(ExpressionParser, ReportsUnbalancedParentheses) {
  expect_error("2 * (x + y", 5, "this \"(\" is never closed", "Add the missing \")\".");
  expect_error("exp(x", 4, "the \"(\" of \"exp\" is never closed", "Add the missing \")\".");
  expect_error("x + y)", 6, "this \")\" closes nothing", "Remove it, or add the missing \"(\".");
}

TEST(ExpressionParser, AsksForTheMissingOperator) {
  expect_error("2x", 2, "an operator is missing after the number \"2\"",
               "Write * for a product: 2 * x.");
  expect_error("x y", 3, "an operator is missing before \"y\"", "Write * for a product: a * b.");
  expect_error("2 (x)", 3, "an operator is missing before \"(\"", "Write * for a product: a * b.");
  expect_error("x(y)", 2, "\"x\" is a quantity, not a function",
               "Write * for a product: x * (...).");
  expect_error("(x) 2", 5, "an operator is missing before \"2\"", "Write * for a product: a * b.");
}

TEST(ExpressionParser, RejectsWhatLooksLikeAnotherLanguage) {
  expect_error("x ** 2", 3, "\"**\" is no operator", "Write ^ for a power.");
  expect_error("x % 2", 3, "\"%\" cannot stand in an expression", kAllowed);
  expect_error("1,5 * x", 2, "a comma stands outside the arguments of a function",
               "Write decimals with a point: 1.5.");
  expect_error("(1,5)", 3, "a comma stands outside the arguments of a function",
               "Write decimals with a point: 1.5.");
  expect_error("x = 1", 3, "\"=\" cannot stand in an expression", kAllowed);
}

TEST(ExpressionParser, RejectsBrokenNumbers) {
  expect_error("1e", 1, "the number \"1e\" has no digits in its exponent", "Write it like 1e-6.");
  expect_error("2 * 1e+", 5, "the number \"1e+\" has no digits in its exponent",
               "Write it like 1e-6.");
  expect_error("1.2.3", 4, "a second decimal point follows the number \"1.2\"",
               "A number has one decimal point: 1.5.");
  expect_error("1e999", 1, "the number \"1e999\" is out of range",
               "Magnitudes from 2.3e-308 to 1.7e308 can be computed with.");
  expect_error(".", 1, "\".\" cannot stand in an expression", kAllowed);
}

TEST(ExpressionParser, SuggestsKnownNames) {
  expect_error("2 * S_acc", 5, "unknown name \"S_acc\"", "Did you mean \"S_ac\"?");
  expect_error("qqqq", 1, "unknown name \"qqqq\"", "");
  expect_error("epx(x)", 1, "unknown function \"epx\"", "Did you mean \"exp\"?");
  expect_error("exp + 1", 1, "the function \"exp\" has no arguments", "Write exp(x).");
}

TEST(ExpressionParser, CountsArguments) {
  expect_error("1 + exp()", 5, "\"exp\" takes 1 argument, not 0", "Write exp(x).");
  expect_error("min(x)", 1, "\"min\" takes 2 arguments, not 1", "Write min(x, y).");
  expect_error("hill(x, y)", 1, "\"hill\" takes 3 arguments, not 2", "Write hill(x, k, n).");
  expect_error("monod(x, y, 1)", 1, "\"monod\" takes 2 arguments, not 3", "Write monod(s, k).");
}

TEST(ExpressionParser, CountsPositionsInCharactersNotBytes) {
  expect_error("x + µ", 5, "\"µ\" cannot stand in an expression", kAllowed);
  expect_error("µ", 1, "\"µ\" cannot stand in an expression", kAllowed);
  expect_error("x + \xff", 5, "byte 0xFF cannot stand in an expression", kAllowed);
  expect_error("x\x01", 2, "byte 0x01 cannot stand in an expression", kAllowed);
  expect_error(std::string_view("x\0y", 3), 2, "byte 0x00 cannot stand in an expression", kAllowed);
}

TEST(ExpressionParser, BoundsNestingAndLength) {
  const auto nested = [](std::size_t n) { return std::string(n, '(') + "x" + std::string(n, ')'); };
  EXPECT_DOUBLE_EQ(value(nested(64)), kX);
  expect_error(nested(65), 65, "the expression is nested more than 64 levels deep",
               "Move parts of it into named terms.");
  std::string tower = "x";
  for (int i = 0; i < 1000; ++i) tower += "^x";
  EXPECT_TRUE(std::holds_alternative<ExpressionError>(parse(tower).result));
  EXPECT_DOUBLE_EQ(value(std::string(4000, '-') + "x"), kX);
  expect_error(std::string(4097, 'x'), 4097,
               "the expression is 4097 characters long; at most 4096 are allowed",
               "Move parts of it into named terms.");
}

}  // namespace
}  // namespace stillzone::kinetics
