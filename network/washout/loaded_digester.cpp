#include "network/washout/loaded_digester.hpp"

#include <algorithm>

namespace stillzone::network {

LoadedDigester::LoadedDigester(const Case& the_case, const FlowBalance& balance,
                               const LoadFlows& flows)
    : flows_(flows),
      digester_(the_case, balance, {.mode = Operation::Mode::mean}),
      change_(the_case, balance.streams(), digester_.layout()) {
  set_parameter(1.0);
}

void LoadedDigester::set_parameter(double load) {
  load_ = load;
  point_ = flows_.at(load);
  digester_.operate(point_);
  change_.set(flows_.derivative(load));
}

void LoadedDigester::parameter_derivative(std::span<const double> y, std::span<double> df) {
  std::ranges::fill(df, 0.0);
  change_.add_rates(y, df);
}

}  // namespace stillzone::network
