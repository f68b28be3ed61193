#include "core/dae/sparse_pattern.hpp"

#include <gtest/gtest.h>

#include "core/require.hpp"

namespace stillzone::core {
namespace {

TEST(SparsePattern, HasEveryDiagonalAndMergesDuplicates) {
  const auto pattern = SparsePattern::of(3, {{2, 0}, {0, 1}, {2, 0}, {1, 1}});
  EXPECT_EQ(pattern.n_entries(), 5);
  EXPECT_EQ(pattern.start, (std::vector<std::int64_t>{0, 2, 4, 5}));
  EXPECT_EQ(pattern.row, (std::vector<std::int64_t>{0, 2, 0, 1, 2}));
  EXPECT_EQ(pattern.diagonal, (std::vector<std::int64_t>{0, 3, 4}));
}

TEST(SparsePattern, FindsEntriesAndOnlyThose) {
  const auto pattern = SparsePattern::of(3, {{2, 0}, {0, 1}});
  EXPECT_EQ(pattern.find(2, 0), 1);
  EXPECT_EQ(pattern.find(0, 1), 2);
  EXPECT_EQ(pattern.find(1, 0), -1);
  EXPECT_EQ(pattern.find(0, 2), -1);
  EXPECT_EQ(pattern.find(3, 0), -1);
  EXPECT_EQ(pattern.find(0, -1), -1);
}

TEST(SparsePattern, RefusesAnEntryOutside) {
  EXPECT_THROW(static_cast<void>(SparsePattern::of(2, {{2, 0}})), ProgramDefect);
  EXPECT_THROW(static_cast<void>(SparsePattern::of(2, {{0, -1}})), ProgramDefect);
}

}  // namespace
}  // namespace stillzone::core
