#include "core/result.hpp"

namespace stillzone::core {

std::string Failure::text() const {
  std::string message = reason;
  if (!place.empty() || !quantity.empty()) {
    message +=
        fmt::format(" (at {}{}{})", place, place.empty() || quantity.empty() ? "" : ", ", quantity);
  }
  if (time_d > 0.0 || time_d < 0.0) message += fmt::format(" at t = {:g} d", time_d);
  message += '.';
  if (!got_done.empty()) message += " " + got_done;
  if (!try_this.empty()) message += " " + try_this;
  return message;
}

}  // namespace stillzone::core
