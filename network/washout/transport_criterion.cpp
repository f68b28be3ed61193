#include "network/washout/transport_criterion.hpp"

#include "core/continuation/spectrum.hpp"
#include "core/dae/evaluation.hpp"

namespace stillzone::network {

TransportMatrix transport_matrix(const Case& the_case, std::span<const Stream> streams,
                                 std::span<const double> rates) {
  TransportMatrix matrix;
  matrix.n = the_case.zones.size();
  matrix.entries.assign(matrix.n * matrix.n, 0.0);
  const auto volume = [&](std::size_t z) { return the_case.zones[z].volume.value(); };
  for (std::size_t s = 0; s < streams.size(); ++s) {
    const auto& [from, to, flow] = streams[s];
    if (from.kind != Place::Kind::zone) continue;
    matrix.entries[from.index * matrix.n + from.index] -= rates[s] / volume(from.index);
    if (to.kind != Place::Kind::zone) continue;
    matrix.entries[to.index * matrix.n + from.index] += rates[s] / volume(to.index);
  }
  return matrix;
}

std::optional<double> washout_rate(const TransportMatrix& matrix) {
  if (matrix.n > kMostZonesForEigenvalues) return std::nullopt;
  const auto abscissa = core::spectral_abscissa(matrix.entries, matrix.n);
  if (!abscissa) return std::nullopt;
  return -*abscissa;
}

std::optional<GroupInvasion> group_invasion(DigesterSystem& system, const TransportMatrix& matrix,
                                            std::span<const double> y, std::size_t component) {
  const std::size_t n = matrix.n;
  if (n > kMostZonesForEigenvalues) return std::nullopt;
  const core::SparsePattern& pattern = system.pattern();
  std::vector<double> values(static_cast<std::size_t>(pattern.n_entries()));
  core::evaluate_jacobian(system, y, values);
  std::vector<double> block(n * n, 0.0);
  const StateLayout& layout = system.layout();
  GroupInvasion group;
  for (std::size_t z = 0; z < n; ++z) {
    for (std::size_t w = 0; w < n; ++w) {
      const auto at = pattern.find(static_cast<std::int64_t>(layout.in_zone(z, component)),
                                   static_cast<std::int64_t>(layout.in_zone(w, component)));
      if (at >= 0) block[z * n + w] = values[static_cast<std::size_t>(at)];
    }
    const double flow = matrix.entries[z * n + z];
    group.net_growth.push_back(block[z * n + z] - flow);
    group.own_loss.push_back(-flow);
    group.biomass.push_back(y[layout.in_zone(z, component)]);
  }
  const auto abscissa = core::spectral_abscissa(block, n);
  if (!abscissa) return std::nullopt;
  group.rate = *abscissa;
  return group;
}

}  // namespace stillzone::network
