# Writes a C++ source that holds the text of every published schema.
#   cmake -DOUTPUT=published_schemas.cpp -DSCHEMAS=dir -P embed_schemas.cmake
file(GLOB files ${SCHEMAS}/*.json)
list(SORT files)
set(entries "")
set(count 0)
foreach(file IN LISTS files)
  get_filename_component(name ${file} NAME_WE)
  file(READ ${file} text)
  string(APPEND entries "    {\"${name}\", R\"stillzone_schema(${text})stillzone_schema\"},\n")
  math(EXPR count "${count} + 1")
endforeach()
file(WRITE ${OUTPUT} "// Written by cli/embed_schemas.cmake from cli/schemas/*.json.
#include \"cli/schemas/published_schemas.hpp\"

#include <array>
#include <utility>

namespace stillzone::cli {
namespace {

constexpr std::array<std::pair<std::string_view, std::string_view>, ${count}> kSchemas{{
${entries}}};

}  // namespace

std::vector<std::string> published_schemas() {
  std::vector<std::string> names;
  for (const auto& [name, text] : kSchemas) names.emplace_back(name);
  return names;
}

std::string_view published_schema(std::string_view name) {
  for (const auto& [known, text] : kSchemas) {
    if (known == name) return text;
  }
  return {};
}

}  // namespace stillzone::cli
")
