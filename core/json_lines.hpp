#pragma once

#include <string>
#include <string_view>
#include <unordered_map>
#include <vector>

namespace stillzone::core {

/// What one pass over a JSON text (comments allowed) tells besides its values.
struct JsonLines {
  std::unordered_map<std::string, int> line_of;  ///< JSON pointer -> line, counted from 1
  struct Problem {
    int line = 0;
    int column = 0;
    std::string pointer;
    std::string found;
    std::string allowed;
    std::string way_out;
  };
  std::vector<Problem> problems;  ///< duplicate keys, trailing commas, nesting too deep
};

/// Linear in the length of the text. Stops quietly where the text is no JSON: the parser then says
/// why.
[[nodiscard]] JsonLines scan_json_lines(std::string_view text);

/// Escapes a key for a JSON pointer (RFC 6901): ~ to ~0, / to ~1.
[[nodiscard]] std::string pointer_escaped(std::string_view key);

}  // namespace stillzone::core
