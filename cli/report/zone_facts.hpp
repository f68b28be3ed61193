#pragma once

#include <optional>
#include <string>
#include <vector>

#include "cli/report/network_figure.hpp"
#include "cli/report/run_report.hpp"
#include "cli/stagnation.hpp"

namespace stillzone::cli {

/// What the flows alone say of each zone.
struct ZoneFacts {
  double turnover = 0.0;  ///< [d] volume over all that flows in, exchanges included
  double feed = 0.0;      ///< [m3/d] that enters it straight from feeds
  double drawn = 0.0;     ///< [m3/d] that leaves it straight to outlets
  bool stagnant = false;
  bool short_circuit = false;  ///< fed and drained itself, and less than half of the volume
};

struct NetworkFacts {
  double volume = 0.0;        ///< [m3] of all zones
  double feed = 0.0;          ///< [m3/d] of all feeds
  double bypass = 0.0;        ///< [m3/d] from feeds straight to outlets
  double retention = 0.0;     ///< [d] nominal: volume over feed
  std::vector<double> rates;  ///< [m3/d] one per stream of the balance
  std::vector<ZoneFacts> zones;
};
[[nodiscard]] NetworkFacts network_facts(const RunReportInput& input);

/// The network figure of a case.
[[nodiscard]] NetworkDrawing network_drawing(const RunReportInput& input,
                                             const NetworkFacts& facts);

/// Value of a state or derived quantity at a place; none when it has no such quantity.
[[nodiscard]] std::optional<network::NamedValue> value_at(const network::PlaceState& place,
                                                          const std::string& name);

}  // namespace stillzone::cli
