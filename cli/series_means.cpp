#include "cli/series_means.hpp"

namespace stillzone::cli {

std::optional<double> series_mean(const network::Series& series, const std::string& place,
                                  const std::string& quantity) {
  const auto& t = series.time;
  if (t.size() < 2 || !(t.back() > t.front())) return std::nullopt;
  for (const auto& column : series.columns) {
    if (column.place != place || column.quantity != quantity) continue;
    double area = 0.0;
    for (std::size_t i = 1; i < t.size(); ++i) {
      area += 0.5 * (t[i] - t[i - 1]) * (column.values[i] + column.values[i - 1]);
    }
    return area / (t.back() - t.front());
  }
  return std::nullopt;
}

}  // namespace stillzone::cli
