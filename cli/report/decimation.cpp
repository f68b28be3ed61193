#include "cli/report/decimation.hpp"

#include <algorithm>
#include <cmath>

namespace stillzone::cli {

namespace {

/// Points of one bucket: indices into the history.
struct Bucket {
  std::size_t first = 0;
  std::size_t lowest = 0;
  std::size_t highest = 0;
  std::size_t last = 0;

  void flush(std::span<const double> x, std::span<const double> y,
             std::vector<ChartPoint>& points) const {
    std::size_t kept[] = {first, lowest, highest, last};
    std::sort(std::begin(kept), std::end(kept));
    const auto* end = std::unique(std::begin(kept), std::end(kept));
    for (const auto* k = std::begin(kept); k != end; ++k) points.push_back({x[*k], y[*k]});
  }
};

}  // namespace

std::vector<ChartPoint> decimated(std::span<const double> x, std::span<const double> y,
                                  std::size_t n_buckets) {
  std::vector<std::size_t> good;
  for (std::size_t i = 0; i < std::min(x.size(), y.size()); ++i) {
    if (std::isfinite(x[i]) && std::isfinite(y[i])) good.push_back(i);
  }
  std::vector<ChartPoint> points;
  if (good.empty()) return points;
  const double from = x[good.front()];
  const double width = (x[good.back()] - from) / static_cast<double>(n_buckets);
  if (good.size() <= 4 * n_buckets || !(width > 0.0)) {
    for (std::size_t i : good) points.push_back({x[i], y[i]});
    return points;
  }
  Bucket bucket;
  std::size_t number = n_buckets;  // none yet
  for (std::size_t i : good) {
    const std::size_t here =
        std::min(n_buckets - 1, static_cast<std::size_t>((x[i] - from) / width));
    if (here != number) {
      if (number != n_buckets) bucket.flush(x, y, points);
      bucket = {i, i, i, i};
      number = here;
      continue;
    }
    if (y[i] < y[bucket.lowest]) bucket.lowest = i;
    if (y[i] > y[bucket.highest]) bucket.highest = i;
    bucket.last = i;
  }
  bucket.flush(x, y, points);
  return points;
}

}  // namespace stillzone::cli
