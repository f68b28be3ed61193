#include "core/output_folder.hpp"

#include <fcntl.h>
#include <fmt/format.h>
#include <unistd.h>

#include <cstdio>
#include <fstream>
#include <system_error>
#include <utility>

#include "core/require.hpp"

namespace stillzone::core {
namespace {

namespace fs = std::filesystem;
constexpr std::string_view kMarker = ".stillzone";

Failure cannot(const std::string& what, const fs::path& path, const std::error_code& error) {
  return {.reason = fmt::format("{} {}: {}", what, path.string(), error.message()),
          .try_this = "Give another folder with --out, or check its permissions and free space."};
}

Failure not_ours(const fs::path& target) {
  return {.reason = fmt::format("{} exists and was not written by stillzone", target.string()),
          .try_this = "Give another folder with --out, or move that one away."};
}

/// Swaps two folders in one step, where system and file system can.
bool exchanged(const fs::path& a, const fs::path& b) {
#ifdef RENAME_EXCHANGE
  return ::renameat2(AT_FDCWD, a.c_str(), AT_FDCWD, b.c_str(), RENAME_EXCHANGE) == 0;
#else
  return false;
#endif
}

bool is_ours(const fs::path& folder) {
  std::error_code error;
  return fs::exists(folder / kMarker, error) || fs::is_empty(folder, error);
}

}  // namespace

Result<OutputFolder> OutputFolder::create(const fs::path& target) {
  std::error_code error;
  fs::path whole = fs::absolute(target, error).lexically_normal();
  if (whole.filename().empty()) whole = whole.parent_path();
  if (fs::exists(whole, error) && (!fs::is_directory(whole, error) || !is_ours(whole))) {
    return not_ours(target);
  }
  const fs::path parent = whole.parent_path();
  if (!fs::is_directory(parent, error)) {
    return Failure{.reason = fmt::format("the folder {} does not exist", parent.string()),
                   .try_this = "Create it, or give another with --out."};
  }
  const fs::path working =
      parent / fmt::format(".{}.{}.part", whole.filename().string(), ::getpid());
  fs::remove_all(working, error);
  fs::create_directory(working, error);
  if (error) return cannot("cannot create", working, error);
  OutputFolder folder(whole, working);
  auto marked = folder.write(kMarker, "This folder is replaced as a whole by the next run.\n");
  if (!marked) return marked.failure();
  return folder;
}

OutputFolder::OutputFolder(fs::path target, fs::path working)
    : target_(std::move(target)), working_(std::move(working)) {}

OutputFolder::OutputFolder(OutputFolder&& other) noexcept
    : target_(std::move(other.target_)), working_(std::exchange(other.working_, {})) {}

OutputFolder::~OutputFolder() {
  std::error_code error;
  if (!working_.empty()) fs::remove_all(working_, error);
}

fs::path OutputFolder::path(std::string_view file) const { return working_ / file; }

Result<Done> OutputFolder::write(std::string_view file, std::string_view content) {
  const fs::path where = path(file);
  std::ofstream out(where, std::ios::binary);
  out.write(content.data(), static_cast<std::streamsize>(content.size()));
  out.close();
  if (!out) {
    return Failure{
        .reason = fmt::format("cannot write {} of {} bytes", where.string(), content.size()),
        .try_this = "Check the free space and the permissions of the folder."};
  }
  return Done{};
}

Result<Done> OutputFolder::commit() {
  SZ_REQUIRE(!working_.empty(), "{} is committed already", target_.string());
  std::error_code error;
  if (!fs::exists(target_, error)) {
    fs::rename(working_, target_, error);
    if (error) return cannot("cannot put in place", target_, error);
  } else {
    // It may have come since create().
    if (!fs::is_directory(target_, error) || !is_ours(target_)) return not_ours(target_);
    if (!exchanged(working_, target_)) {
      const fs::path old = working_.string() + ".old";
      fs::remove_all(old, error);
      fs::rename(target_, old, error);
      if (error) return cannot("cannot replace", target_, error);
      fs::rename(working_, target_, error);
      if (error) {
        std::error_code undo;
        fs::rename(old, target_, undo);
        return cannot("cannot put in place", target_, error);
      }
      working_ = old;
    }
    fs::remove_all(working_, error);  // the old content
  }
  working_.clear();
  return Done{};
}

}  // namespace stillzone::core
