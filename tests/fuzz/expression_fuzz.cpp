// Expression parser, simplification and differentiation.
#include <array>
#include <string>

#include "kinetics/expression_parser.hpp"
#include "tests/fuzz/fuzz_support.hpp"

int LLVMFuzzerTestOneInput(const std::uint8_t* data, std::size_t size) {
  using namespace stillzone;
  const std::string_view text = fuzz::text_of(data, size);
  kinetics::ExpressionGraph graph;
  const auto lookup = [&](std::string_view name) -> std::optional<kinetics::NodeId> {
    if (name == "x") return graph.input(0);
    if (name == "y") return graph.input(1);
    return std::nullopt;
  };
  const auto suggestion = [](std::string_view) { return std::string(); };
  const auto parsed = kinetics::parse_expression(text, graph, lookup, suggestion);
  if (const auto* error = std::get_if<kinetics::ExpressionError>(&parsed)) {
    fuzz::promise(error->position >= 1 && error->position <= text.size() + 1,
                  "an error points into the text");
    fuzz::promise(!error->problem.empty(), "an error says why");
    return 0;
  }
  const auto node = std::get<kinetics::NodeId>(parsed);
  const std::array<double, 2> at = {0.7, 2.3};
  static_cast<void>(graph.evaluate(node, at));
  for (const std::size_t input : {0U, 1U}) {
    static_cast<void>(graph.evaluate(graph.derivative(node, input), at));
  }
  return 0;
}
