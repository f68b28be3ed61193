#pragma once

#include <cstddef>
#include <memory>
#include <span>
#include <vector>

namespace stillzone::network {

/// A way water can take from one place to the next. An exchange is two links.
struct Link {
  std::size_t from = 0;
  std::size_t to = 0;
};

/// The places of a digester (zones, feeds, outlets, numbered 0 .. n-1) and the ways between them.
/// Knows nothing of what flows or lives in it.
class ZoneGraph {
 public:
  /// @param links each end < n_places; parallel links are fine.
  ZoneGraph(std::size_t n_places, std::span<const Link> links);
  ~ZoneGraph();
  ZoneGraph(const ZoneGraph&) = delete;
  ZoneGraph& operator=(const ZoneGraph&) = delete;

  /// Which places water from `starts` gets to (the starts themselves included). Size n_places.
  [[nodiscard]] std::vector<bool> reached_from(std::span<const std::size_t> starts) const;
  /// From which places water gets to `ends` (the ends themselves included). Size n_places.
  [[nodiscard]] std::vector<bool> leading_to(std::span<const std::size_t> ends) const;
  /// Groups of two or more places that water can go round (strongly connected components), each
  /// sorted, ordered by their first place.
  [[nodiscard]] std::vector<std::vector<std::size_t>> loops() const;
  /// Number of the connected part (links taken both ways) each place belongs to, counted from 0 in
  /// the order of their first places. Size n_places.
  [[nodiscard]] std::vector<std::size_t> parts() const;

 private:
  struct Impl;
  std::unique_ptr<const Impl> impl_;
};

}  // namespace stillzone::network
