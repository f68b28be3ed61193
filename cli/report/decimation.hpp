#pragma once

#include <span>
#include <vector>

namespace stillzone::cli {

struct ChartPoint {
  double x = 0.0;
  double y = 0.0;
};

/// A long history made short without losing its extremes: the range of x is cut into equal buckets
/// and of each the first, lowest, highest and last point are kept, in their order. The whole
/// history comes back when it has no more than 4 points per bucket on average.
/// @param x rising; @param y same size; points that are not finite are left out
/// @return at most 4 * n_buckets points, the lowest and highest of all among them
[[nodiscard]] std::vector<ChartPoint> decimated(std::span<const double> x,
                                                std::span<const double> y, std::size_t n_buckets);

}  // namespace stillzone::cli
