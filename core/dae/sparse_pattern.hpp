#pragma once

#include <cstdint>
#include <vector>

namespace stillzone::core {

/// Where a square sparse matrix may be non-zero: compressed columns, rows rising in each column,
/// no duplicates. 64-bit indices throughout.
struct SparsePattern {
  std::int64_t n = 0;               ///< rows = columns
  std::vector<std::int64_t> start;  ///< size n + 1: column j holds entries [start[j], start[j+1])
  std::vector<std::int64_t> row;    ///< size start[n]
  std::vector<std::int64_t> diagonal;  ///< size n: position of entry (j, j); every one is present

  [[nodiscard]] std::int64_t n_entries() const { return start.empty() ? 0 : start.back(); }
  /// Position of entry (r, c), or -1.
  [[nodiscard]] std::int64_t find(std::int64_t r, std::int64_t c) const;

  struct Entry {
    std::int64_t row = 0;
    std::int64_t column = 0;
  };
  /// Builds a pattern from entries in any order, duplicates merged, all diagonals added.
  static SparsePattern of(std::int64_t n, std::vector<Entry> entries);
};

}  // namespace stillzone::core
