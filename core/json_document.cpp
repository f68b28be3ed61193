#include "core/json_document.hpp"

#include <fmt/format.h>

#include <cmath>
#include <fstream>
#include <utility>
#include <vector>

#include "core/json_lines.hpp"
#include "core/near_name.hpp"

namespace stillzone::core {
namespace {

constexpr std::size_t kLargest = std::size_t{64} << 20U;  // bytes

/// True when the text is UTF-8: what the library would have to replace comes back changed.
bool is_utf8(const std::string& text) {
  const auto shown = Json(text).dump(-1, ' ', false, Json::error_handler_t::replace);
  return Json::parse(shown, nullptr, false) == Json(text);
}

/// At most `most` bytes and one more, so that an endless file ends too.
bool read_bytes(const std::filesystem::path& path, std::size_t most, std::string& text) {
  std::ifstream file(path, std::ios::binary);
  if (!file) return false;
  std::vector<char> block(std::size_t{1} << 16U);
  while (text.size() <= most && file) {
    file.read(block.data(), static_cast<std::streamsize>(block.size()));
    text.append(block.data(), static_cast<std::size_t>(file.gcount()));
  }
  return !file.bad();
}

/// The parser's complaint without its own numbering: what follows "parse error at ...: ".
std::string parser_words(const std::string& what) {
  auto start = what.find("syntax error");
  if (start == std::string::npos) start = what.rfind("] ") + 2;
  return what.substr(start);
}

/// Line of a byte in the text, counted from 1.
int line_at(std::string_view text, std::size_t byte) {
  int line = 1;
  for (std::size_t i = 0; i < std::min(byte, text.size()); ++i) line += text[i] == '\n' ? 1 : 0;
  return line;
}

/// Parses with the library; its error becomes a fault with line.
std::optional<Json> parse_text(std::string_view text, const std::string& name, FaultList& faults) {
  try {
    return Json::parse(text, nullptr, true, true);
  } catch (const Json::parse_error& error) {
    // The byte counted is the one after the token that surprised the parser.
    faults.add({.file = name,
                .line = line_at(text, error.byte > 0 ? error.byte - 1 : 0),
                .found = "this is not JSON",
                .allowed = parser_words(error.what()),
                .way_out = "Look just before this place for a missing quote, comma or bracket."});
  } catch (const Json::exception& error) {
    faults.add({.file = name,
                .found = "a value that cannot be read",
                .allowed = parser_words(error.what()),
                .way_out = "Use numbers that fit a double."});
  }
  return std::nullopt;
}

std::vector<std::string> pointer_parts(std::string_view pointer) {
  std::vector<std::string> parts;
  std::string part;
  for (std::size_t i = 1; i <= pointer.size(); ++i) {
    if (i == pointer.size() || pointer[i] == '/') {
      parts.push_back(part);
      part.clear();
    } else if (pointer[i] == '~' && i + 1 < pointer.size()) {
      part += pointer[++i] == '1' ? '/' : '~';
    } else {
      part += pointer[i];
    }
  }
  return parts;
}

std::optional<std::size_t> array_index(const std::string& part, std::size_t size) {
  if (part.empty() || part.size() > 9) return std::nullopt;
  for (const char c : part) {
    if (c < '0' || c > '9') return std::nullopt;
  }
  const auto index = std::size_t{std::stoul(part)};
  return index < size ? std::optional(index) : std::nullopt;
}

std::vector<std::string> keys_of(const Json& object) {
  std::vector<std::string> keys;
  for (const auto& [key, value] : object.items()) keys.push_back(key);
  return keys;
}

}  // namespace

std::optional<JsonDocument> JsonDocument::parse(std::string_view text, std::string name,
                                                std::filesystem::path folder, FaultList& faults) {
  if (text.substr(0, 3) == "\xEF\xBB\xBF") text.remove_prefix(3);
  if (text.substr(0, 2) == "\xFF\xFE" || text.substr(0, 2) == "\xFE\xFF") {
    faults.add({.file = std::move(name),
                .line = 1,
                .found = "a UTF-16 file",
                .allowed = "input files are UTF-8 text",
                .way_out = "Save it again as UTF-8."});
    return std::nullopt;
  }
  JsonDocument document;
  document.name_ = std::move(name);
  document.folder_ = std::move(folder);
  if (text.find_first_not_of(" \t\r\n") == std::string_view::npos) {
    faults.add({.file = document.name_,
                .found = "the file is empty",
                .allowed = "an input file is one JSON object",
                .way_out = "`stillzone schema` shows what belongs in it."});
    return std::nullopt;
  }
  JsonLines lines = scan_json_lines(text);
  for (const JsonLines::Problem& problem : lines.problems) {
    faults.add({.file = document.name_,
                .pointer = problem.pointer,
                .line = problem.line,
                .found = problem.found,
                .allowed = problem.allowed,
                .way_out = problem.way_out});
  }
  if (!lines.problems.empty()) return std::nullopt;
  auto root = parse_text(text, document.name_, faults);
  if (!root) return std::nullopt;
  document.root_ = std::move(*root);
  document.lines_ = std::move(lines.line_of);
  return document;
}

std::optional<JsonDocument> JsonDocument::read(const std::filesystem::path& path,
                                               FaultList& faults) {
  std::error_code error;
  const std::string name = path.string();
  const auto refuse = [&](const char* found, const char* allowed) {
    faults.add({.file = name,
                .found = found,
                .allowed = allowed,
                .way_out = "Check the name and the folder you are in."});
  };
  if (!std::filesystem::exists(path, error)) {
    refuse("there is no such file", "an input file must exist");
    return std::nullopt;
  }
  if (std::filesystem::is_directory(path, error)) {
    refuse("this is a folder", "an input file is needed");
    return std::nullopt;
  }
  std::string text;
  if (!read_bytes(path, kLargest, text)) {
    refuse("the file cannot be read", "an input file must be readable");
    return std::nullopt;
  }
  if (text.size() > kLargest) {
    refuse("the file is larger than 64 MiB", "an input file is at most that");
    return std::nullopt;
  }
  return parse(text, name, path.parent_path(), faults);
}

int JsonDocument::line_of(std::string_view pointer) const {
  std::string place(pointer);
  while (true) {
    if (const auto found = lines_.find(place); found != lines_.end()) return found->second;
    const auto slash = place.rfind('/');
    if (slash == std::string::npos) return 0;
    place.resize(slash);
  }
}

void JsonDocument::set(std::string_view pointer_and_value, FaultList& faults) {
  const auto refuse = [&](std::string found, std::string allowed, std::string way_out) {
    faults.add({.file = "--set " + std::string(pointer_and_value),
                .found = std::move(found),
                .allowed = std::move(allowed),
                .way_out = std::move(way_out)});
  };
  const auto equals = pointer_and_value.find('=');
  if (equals == std::string_view::npos || pointer_and_value.empty() ||
      pointer_and_value.front() != '/') {
    refuse("no \"/pointer=value\"", "a setting is a JSON pointer, \"=\" and a value",
           "Write for example --set \"/zones/core/volume=900 m3\".");
    return;
  }
  const std::string pointer(pointer_and_value.substr(0, equals));
  const std::string text(pointer_and_value.substr(equals + 1));
  if (!is_utf8(pointer) || !is_utf8(text)) {
    faults.add({.file = "--set",
                .found = "bytes that are no UTF-8",
                .allowed = "a setting is UTF-8 text",
                .way_out = "Check the terminal's encoding."});
    return;
  }
  const std::vector<std::string> parts = pointer_parts(pointer);
  Json* node = &root_;
  std::string walked;
  for (std::size_t i = 0; i < parts.size(); ++i) {
    const bool last = i + 1 == parts.size();
    const std::string& part = parts[i];
    if (node->is_array()) {
      const auto index = array_index(part, node->size());
      if (!index) {
        refuse(fmt::format("\"{}\" after \"{}\"", part, walked),
               fmt::format("a list of {} entries is counted from 0", node->size()),
               "Give the number of an entry.");
        return;
      }
      node = &(*node)[*index];
    } else if (node->is_object() && (node->contains(part) || last)) {
      node = &(*node)[part];
    } else {
      refuse(fmt::format("no \"{}\" in \"{}\"", part, walked.empty() ? "/" : walked),
             node->is_object() ? "a setting changes or adds one value in what is there"
                               : "there is nothing below a single value",
             node->is_object() ? name_hint(part, keys_of(*node)) : "Shorten the pointer.");
      return;
    }
    walked += "/" + pointer_escaped(part);
  }
  Json value = Json::parse(text, nullptr, false);
  *node = value.is_discarded() ? Json(text) : std::move(value);
  // What was set has no line in the file.
  std::erase_if(lines_, [&](const auto& entry) {
    return entry.first == walked || entry.first.rfind(walked + "/", 0) == 0;
  });
  lines_[walked] = 0;
}

}  // namespace stillzone::core
