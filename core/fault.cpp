#include "core/fault.hpp"

#include <fmt/format.h>

namespace stillzone::core {

std::string Fault::text() const {
  std::string place = file;
  if (!pointer.empty()) place += (place.empty() ? "" : " ") + pointer;
  if (line > 0) place += fmt::format(" (line {})", line);
  if (character > 0) place += fmt::format("{}character {}", place.empty() ? "" : ", ", character);
  std::string message = place.empty() ? std::string() : place + ": ";
  message += found;
  if (!allowed.empty()) message += "; " + allowed;
  if (!message.empty() && message.back() != '.') message += '.';
  if (!way_out.empty()) message += " " + way_out;
  return message;
}

std::string FaultList::text() const {
  std::string all_text;
  for (const Fault& fault : faults_) all_text += fault.text() + "\n";
  return all_text;
}

}  // namespace stillzone::core
