#pragma once

#include <string>
#include <vector>

#include "network/case.hpp"
#include "network/flow_balance.hpp"

namespace stillzone::cli {

/// A balanced network as tables, and what stands out in it.
class NetworkView {
 public:
  /// @param rates [m3/d] of the balance's streams; all three must outlive the view.
  NetworkView(const network::Case& the_case, const network::FlowBalance& balance,
              const std::vector<double>& rates);

  [[nodiscard]] double total_volume() const { return total_volume_; }  ///< [m3]
  [[nodiscard]] double total_feed() const { return total_feed_; }      ///< [m3/d]
  [[nodiscard]] std::string zone_table() const;
  [[nodiscard]] std::string stream_table() const;
  /// Plain sentences: zones that turn over slowly, feed that meets no zone, warnings of the
  /// readers.
  [[nodiscard]] std::vector<std::string> remarks() const;

 private:
  const network::Case& case_;
  const network::FlowBalance& balance_;
  const std::vector<double>& rates_;
  std::vector<double> inflow_;  ///< [m3/d] of each zone, exchanges included
  double total_volume_ = 0.0;
  double total_feed_ = 0.0;
};

}  // namespace stillzone::cli
