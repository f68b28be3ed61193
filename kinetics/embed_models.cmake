# Writes a C++ source that holds the text of every model file.
#   cmake -DOUTPUT=shipped_models.cpp -DMODELS=dir -P embed_models.cmake
file(GLOB files ${MODELS}/*.json)
list(SORT files)
set(entries "")
set(count 0)
foreach(file IN LISTS files)
  get_filename_component(name ${file} NAME_WE)
  file(READ ${file} text)
  string(FIND "${text}" ")stillzone_model\"" clash)
  if(NOT clash EQUAL -1)
    message(FATAL_ERROR "${file} holds the mark that ends an embedded text")
  endif()
  string(APPEND entries "    {\"${name}\", R\"stillzone_model(${text})stillzone_model\"},\n")
  math(EXPR count "${count} + 1")
endforeach()
file(WRITE ${OUTPUT} "// Written by kinetics/embed_models.cmake from kinetics/models/*.json.
#include <array>

#include \"kinetics/shipped_model_files.hpp\"

namespace stillzone::kinetics {

namespace {

constexpr std::array<ShippedModelFile, ${count}> kFiles{{
${entries}}};

}  // namespace

std::span<const ShippedModelFile> shipped_model_files() { return kFiles; }

}  // namespace stillzone::kinetics
")
