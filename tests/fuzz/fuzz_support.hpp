#pragma once

#include <cstddef>
#include <cstdint>
#include <cstdlib>
#include <iostream>
#include <string_view>

/// One input of a fuzzer. libFuzzer calls it with inputs it makes up, replay_main.cpp with the
/// files of the corpus. Always 0; a broken promise ends the process.
extern "C" int LLVMFuzzerTestOneInput(const std::uint8_t* data, std::size_t size);

namespace stillzone::fuzz {

inline std::string_view text_of(const std::uint8_t* data, std::size_t size) {
  return {reinterpret_cast<const char*>(data), size};
}

/// Ends the process when a promise of a reader does not hold for this input.
inline void promise(bool holds, std::string_view what) {
  if (holds) return;
  std::cerr << "broken promise: " << what << '\n';
  std::abort();
}

}  // namespace stillzone::fuzz
