#pragma once

#include <filesystem>
#include <memory>
#include <nlohmann/json.hpp>
#include <optional>
#include <string>
#include <string_view>
#include <unordered_map>

#include "core/fault.hpp"

namespace stillzone::core {

/// Order of keys as written is kept: zones, flows and columns appear as the user listed them.
using Json = nlohmann::ordered_json;

/// A JSON file as read: the value, its name for messages, and the line of every node.
/// Comments (// and /* */) are allowed; duplicate keys, trailing commas, non-finite numbers, wrong
/// UTF-8 and nesting deeper than 64 are faults with their line.
class JsonDocument {
 public:
  /// @param name how the file is called in messages (as the user wrote it)
  /// @param folder where relative paths in the file start
  [[nodiscard]] static std::optional<JsonDocument> parse(std::string_view text, std::string name,
                                                         std::filesystem::path folder,
                                                         FaultList& faults);
  [[nodiscard]] static std::optional<JsonDocument> read(const std::filesystem::path& path,
                                                        FaultList& faults);

  [[nodiscard]] const Json& root() const { return root_; }
  [[nodiscard]] const std::string& name() const { return name_; }
  [[nodiscard]] const std::filesystem::path& folder() const { return folder_; }
  /// Line of the node at a JSON pointer, counted from 1; of its nearest parent when unknown; 0 when
  /// nothing is known (a value set from the command line).
  [[nodiscard]] int line_of(std::string_view pointer) const;

  /// `--set /json/pointer=value`: replaces or adds one value. The value is read as JSON when it
  /// parses as such, else as a string ("170 m3/d"). A pointer whose parent does not exist is a
  /// fault with the nearest key.
  void set(std::string_view pointer_and_value, FaultList& faults);

 private:
  Json root_;
  std::string name_;
  std::filesystem::path folder_;
  std::unordered_map<std::string, int> lines_;
};

}  // namespace stillzone::core
