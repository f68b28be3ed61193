#pragma once

#include <optional>
#include <string>
#include <string_view>
#include <vector>

#include "core/fault.hpp"
#include "network/case.hpp"
#include "network/flow_balance.hpp"

namespace stillzone::network {

/// Builds networks for tests in few words. Places are named on first use: zones by zone(), feeds by
/// feed(), outlets by outlet(); flows name them.
class NetworkSketch {
 public:
  NetworkSketch& zone(const std::string& name, double volume = 1000.0);
  NetworkSketch& feed(const std::string& name, double flow);
  NetworkSketch& outlet(const std::string& name);
  NetworkSketch& schedule(const std::string& name, core::Timeline::Periodic periodic, double idle);
  /// Puts the last feed or flow under a schedule.
  NetworkSketch& feed_follows(const std::string& schedule);
  NetworkSketch& flow_follows(const std::string& schedule);
  NetworkSketch& feed_record(std::vector<double> times, std::vector<double> flows);

  NetworkSketch& given(const std::string& from, const std::string& to, double flow);
  NetworkSketch& share(const std::string& from, const std::string& to, double share);
  NetworkSketch& rest(const std::string& from, const std::string& to);
  NetworkSketch& exchange(const std::string& a, const std::string& b, double flow);

  [[nodiscard]] const Case& the_case() const { return case_; }
  [[nodiscard]] Case& the_case() { return case_; }

 private:
  [[nodiscard]] Place place(const std::string& name) const;
  Flow& add_flow(const std::string& from, const std::string& to);
  [[nodiscard]] ScheduleIndex schedule_index(const std::string& name) const;
  Case case_;
};

/// What became of a balance: the solution, or the faults' text.
struct Balanced {
  std::optional<FlowBalance> balance;
  std::string faults;
};
[[nodiscard]] Balanced balanced(const Case& the_case);

/// Mean rates at time 0 of a case that must balance, by stream.
[[nodiscard]] std::vector<double> rates_of(const Case& the_case);

/// A file below the source folder, whole.
[[nodiscard]] std::string file_text(const std::string& path);

}  // namespace stillzone::network
