#include "core/dae/sparse_pattern.hpp"

#include <algorithm>
#include <cstddef>

#include "core/require.hpp"

namespace stillzone::core {

std::int64_t SparsePattern::find(std::int64_t r, std::int64_t c) const {
  if (r < 0 || c < 0 || r >= n || c >= n) return -1;
  const auto first = row.begin() + start[static_cast<std::size_t>(c)];
  const auto last = row.begin() + start[static_cast<std::size_t>(c) + 1];
  const auto place = std::lower_bound(first, last, r);
  return place != last && *place == r ? place - row.begin() : -1;
}

SparsePattern SparsePattern::of(std::int64_t n, std::vector<Entry> entries) {
  SZ_REQUIRE(n >= 0, "n {}", n);
  for (const Entry& entry : entries) {
    SZ_REQUIRE(entry.row >= 0 && entry.row < n && entry.column >= 0 && entry.column < n,
               "entry ({}, {}) outside {} x {}", entry.row, entry.column, n, n);
  }
  for (std::int64_t i = 0; i < n; ++i) entries.push_back({i, i});
  std::sort(entries.begin(), entries.end(), [](const Entry& a, const Entry& b) {
    return a.column != b.column ? a.column < b.column : a.row < b.row;
  });
  const auto same = [](const Entry& a, const Entry& b) {
    return a.column == b.column && a.row == b.row;
  };
  entries.erase(std::unique(entries.begin(), entries.end(), same), entries.end());

  SparsePattern pattern;
  pattern.n = n;
  pattern.start.assign(static_cast<std::size_t>(n) + 1, 0);
  pattern.diagonal.assign(static_cast<std::size_t>(n), 0);
  pattern.row.reserve(entries.size());
  for (const Entry& entry : entries) {
    const auto column = static_cast<std::size_t>(entry.column);
    if (entry.row == entry.column) {
      pattern.diagonal[column] = static_cast<std::int64_t>(pattern.row.size());
    }
    pattern.row.push_back(entry.row);
    pattern.start[column + 1] = static_cast<std::int64_t>(pattern.row.size());
  }
  return pattern;
}

}  // namespace stillzone::core
