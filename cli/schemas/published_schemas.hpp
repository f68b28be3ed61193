#pragma once

#include <string>
#include <string_view>
#include <vector>

namespace stillzone::cli {

/// Names of the JSON Schemas (draft-07) compiled in from cli/schemas/*.json.
[[nodiscard]] std::vector<std::string> published_schemas();
/// Text of one; empty for an unknown name.
[[nodiscard]] std::string_view published_schema(std::string_view name);

}  // namespace stillzone::cli
