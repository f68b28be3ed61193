#include <fmt/format.h>

#include "core/near_name.hpp"
#include "network/case_reading.hpp"

namespace stillzone::network {

using core::Json;
using core::Measure;
using core::ObjectReader;
using Need = core::ObjectReader::Need;

namespace {

std::optional<GasTransfer> read_gas(CaseReading& reading, ObjectReader& zone) {
  auto gas = zone.object("gas", Need::optional);
  if (!gas) return std::nullopt;
  const auto to = gas->text("to", Need::required);
  const auto coefficient = gas->quantity<Measure::rate>("kLa", Need::required,
                                                        ObjectReader::not_negative(Measure::rate));
  gas->finish();
  if (!to) return std::nullopt;
  const auto place = reading.places.find(*to);
  if (place == reading.places.end() || place->second.kind != CaseReading::Kind::headspace) {
    std::vector<std::string> headspaces;
    for (const Headspace& headspace : reading.result.headspaces) {
      headspaces.push_back(headspace.name);
    }
    gas->fault("to", fmt::format("\"{}\"", *to), "gas goes to one of the case's \"headspaces\"",
               headspaces.empty() ? "Add it to \"headspaces\"." : core::name_hint(*to, headspaces));
    return std::nullopt;
  }
  if (!coefficient) return std::nullopt;
  return GasTransfer{HeadspaceIndex(place->second.index), *coefficient};
}

GasPipe read_pipe(ObjectReader& headspace) {
  GasPipe pipe;
  auto reader = headspace.object("pipe", Need::required);
  if (!reader) return pipe;
  if (const auto coefficient = reader->quantity<Measure::gas_conductance>(
          "coefficient", Need::required, ObjectReader::positive(Measure::gas_conductance))) {
    pipe.coefficient = *coefficient;
  }
  if (const auto back = reader->quantity<Measure::pressure>(
          "back_pressure", Need::required, ObjectReader::positive(Measure::pressure))) {
    pipe.back_pressure = *back;
  }
  if (const auto opening = reader->quantity<Measure::pressure>(
          "opening_pressure", Need::optional, ObjectReader::not_negative(Measure::pressure))) {
    pipe.opening_pressure = *opening;
  }
  reader->finish();
  return pipe;
}

core::Temperature read_temperature(const CaseReading& reading, ObjectReader& place) {
  return place
      .quantity<Measure::temperature>("temperature", Need::optional, liquid_temperature_limit())
      .value_or(reading.result.temperature);
}

}  // namespace

void read_headspaces(CaseReading& reading, ObjectReader& root) {
  root.each_member("headspaces", Need::optional,
                   [&](const std::string& name, const Json& node, const std::string& pointer) {
                     reading.take_name(name, pointer, CaseReading::Kind::headspace,
                                       reading.result.headspaces.size());
                     ObjectReader reader(reading.context, node, pointer);
                     Headspace headspace;
                     headspace.name = name;
                     if (node.is_object()) {
                       headspace.volume =
                           reader
                               .quantity<Measure::volume>("volume", Need::required,
                                                          ObjectReader::positive(Measure::volume))
                               .value_or(core::Volume());
                       headspace.temperature = read_temperature(reading, reader);
                       headspace.pipe = read_pipe(reader);
                       reader.finish();
                     }
                     reading.result.headspaces.push_back(std::move(headspace));
                   });
}

void read_zones(CaseReading& reading, ObjectReader& root) {
  root.each_member(
      "zones", Need::required,
      [&](const std::string& name, const Json& node, const std::string& pointer) {
        reading.take_name(name, pointer, CaseReading::Kind::zone, reading.result.zones.size());
        ObjectReader reader(reading.context, node, pointer);
        Zone zone;
        zone.name = name;
        if (node.is_object()) {
          zone.volume = reader
                            .quantity<Measure::volume>("volume", Need::required,
                                                       ObjectReader::positive(Measure::volume))
                            .value_or(core::Volume());
          zone.temperature = read_temperature(reading, reader);
          zone.gas = read_gas(reading, reader);
          reader.finish();
        }
        reading.result.zones.push_back(std::move(zone));
      });
  const Json* zones = root.raw("zones");
  if (zones != nullptr && zones->is_object() && zones->empty()) {
    root.fault("zones", "no zones", "a case has at least one zone",
               "Add one, such as \"tank\": { \"volume\": \"1000 m3\" }.");
  }
}

}  // namespace stillzone::network
