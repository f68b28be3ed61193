#include "network/gas_pipe.hpp"

namespace stillzone::network {

PipeFlow pipe_flow(const GasPipe& pipe, double pressure, double width) {
  const double over = pressure - pipe.back_pressure.value() - pipe.opening_pressure.value();
  const double k = pipe.coefficient.value();
  if (over <= 0.0) return {};
  if (over >= width) return {k * over, k};
  const double s = over / width;
  return {k * width * s * s * s * (6.0 - 8.0 * s + 3.0 * s * s),
          k * s * s * (18.0 - 32.0 * s + 15.0 * s * s)};
}

}  // namespace stillzone::network
