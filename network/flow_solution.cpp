#include "network/flow_solution.hpp"

#include <algorithm>
#include <cmath>

namespace stillzone::network {

FlowSolution::FlowSolution(const Case& the_case)
    : equations(the_case),
      system(equations.rows, equations.known),
      means(schedule_means(the_case)) {}

std::vector<double> FlowSolution::known_variables(const Case& the_case,
                                                  const SwitchState& state) const {
  std::vector<double> x(equations.known.size(), 0.0);
  for (std::size_t i = 0; i < equations.n_flows; ++i) {
    const Flow& flow = the_case.flows[i];
    if (!flow.given) continue;
    x[i] = flow.given->value() * (flow.schedule ? state.factors[flow.schedule->value()] : 1.0);
  }
  for (std::size_t f = 0; f < equations.n_feeds; ++f) {
    double factor = 1.0;
    if (const auto schedule = the_case.feeds[f].schedule) {
      factor = state.factors[schedule->value()] / means[schedule->value()];
    }
    x[equations.feed_rate(f)] = state.feeds[f] * factor;
  }
  return x;
}

std::vector<double> FlowSolution::variables(const Case& the_case, const SwitchState& state) const {
  std::vector<double> x = known_variables(the_case, state);
  const double scale = *std::max_element(x.begin(), x.end());
  system.substitute(x);
  for (std::size_t i = 0; i < equations.n_flows; ++i) {
    if (std::abs(x[i]) <= 1e-13 * scale) x[i] = 0.0;  // what rounding leaves of "the rest"
  }
  return x;
}

SwitchState FlowSolution::mean_state(const Case& the_case, double t) const {
  SwitchState state = state_at(the_case, t);
  state.factors = means;
  return state;
}

std::vector<double> stream_rates(std::span<const Stream> streams, const Case& the_case,
                                 const FlowEquations& equations,
                                 std::span<const double> variables) {
  std::vector<double> rates;
  rates.reserve(streams.size());
  for (const Stream& stream : streams) {
    double rate = variables[stream.flow];
    const Flow& flow = the_case.flows[stream.flow];
    if (flow.exchange) {
      const double drift = variables[equations.drift(stream.flow)];
      rate += std::max(0.0, stream.from == flow.from ? drift : -drift);
    }
    rates.push_back(rate);
  }
  return rates;
}

}  // namespace stillzone::network
