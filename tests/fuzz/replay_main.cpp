// Runs one fuzz target over files instead of over made-up inputs: every file below the folders
// given.
#include <filesystem>
#include <fstream>
#include <iostream>
#include <iterator>
#include <string>
#include <vector>

#include "tests/fuzz/fuzz_support.hpp"

int main(int argc, char** argv) {
  std::size_t n_files = 0;
  const std::vector<std::string> folders(argv + 1, argv + argc);
  for (const std::string& folder : folders) {
    const std::size_t before = n_files;
    for (const auto& entry : std::filesystem::recursive_directory_iterator(folder)) {
      if (!entry.is_regular_file()) continue;
      std::cout << entry.path().string() << std::endl;  // flushed: names the input of a crash
      std::ifstream file(entry.path(), std::ios::binary);
      const std::vector<char> bytes(std::istreambuf_iterator<char>(file), {});
      const std::vector<std::uint8_t> data(bytes.begin(), bytes.end());
      LLVMFuzzerTestOneInput(data.data(), data.size());
      ++n_files;
    }
    if (n_files == before) {
      std::cerr << "no files in " << folder << '\n';
      return 1;
    }
  }
  std::cout << n_files << " inputs\n";
  return n_files > 0 ? 0 : 1;
}
