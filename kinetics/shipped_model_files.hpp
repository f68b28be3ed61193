#pragma once

#include <span>
#include <string_view>

namespace stillzone::kinetics {

/// A model file of kinetics/models/, as compiled in.
struct ShippedModelFile {
  std::string_view name;  ///< file name without ".json"
  std::string_view text;
};

/// All of them, in alphabetical order. Defined in a source file that the build writes
/// (kinetics/embed_models.cmake).
[[nodiscard]] std::span<const ShippedModelFile> shipped_model_files();

}  // namespace stillzone::kinetics
