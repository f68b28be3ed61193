#pragma once

#include <filesystem>
#include <string>
#include <string_view>

#include "core/result.hpp"

namespace stillzone::core {

/// Collects the files of one analysis in a hidden folder beside the target and swaps it in at the
/// end: readers see the old folder or the new one, never half. Without `commit()` nothing is left.
/// A target that exists and was not written by us (no marker file) is refused, not deleted.
class OutputFolder {
 public:
  [[nodiscard]] static Result<OutputFolder> create(const std::filesystem::path& target);
  ~OutputFolder();
  OutputFolder(OutputFolder&& other) noexcept;
  OutputFolder& operator=(OutputFolder&&) = delete;
  OutputFolder(const OutputFolder&) = delete;
  OutputFolder& operator=(const OutputFolder&) = delete;

  /// Path of a file inside the folder that is being filled.
  [[nodiscard]] std::filesystem::path path(std::string_view file) const;
  [[nodiscard]] Result<Done> write(std::string_view file, std::string_view content);
  /// Puts the folder in place; the object is empty afterwards.
  [[nodiscard]] Result<Done> commit();

 private:
  OutputFolder(std::filesystem::path target, std::filesystem::path working);
  std::filesystem::path target_;
  std::filesystem::path working_;
};

}  // namespace stillzone::core
