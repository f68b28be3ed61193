#include "core/units.hpp"

#include <fmt/format.h>
#include <udunits2.h>

#include <array>
#include <charconv>
#include <cmath>
#include <regex>
#include <stdexcept>
#include <vector>

namespace stillzone::core {
namespace {

struct UnitDeleter {
  void operator()(ut_unit* unit) const { ut_free(unit); }
};
using Unit = std::unique_ptr<ut_unit, UnitDeleter>;

constexpr std::array kAllMeasures = {
    Measure::volume,
    Measure::flow,
    Measure::duration,
    Measure::rate,
    Measure::temperature,
    Measure::pressure,
    Measure::concentration,
    Measure::mass,
    Measure::mass_flow,
    Measure::length,
    Measure::area,
    Measure::power,
    Measure::energy,
    Measure::unit_power,
    Measure::dynamic_viscosity,
    Measure::gas_conductance,
    Measure::heat_transfer,
    Measure::share,
};

/// The trade's own words, and common ones that UDUNITS reads as something else. A million gallons
/// is US gallons; a revolution counts 1, not 2 pi; a year is 365.25 d.
struct OwnSymbol {
  const char* symbol;
  const char* definition;
};
constexpr std::array kOwnSymbols = {
    OwnSymbol{"gal", "3.785411784 L"},
    OwnSymbol{"MG", "3785411.784 L"},
    OwnSymbol{"MGD", "3785411.784 L/day"},
    OwnSymbol{"mgd", "3785411.784 L/day"},
    OwnSymbol{"gpm", "3.785411784 L/minute"},
    OwnSymbol{"gpd", "3.785411784 L/day"},
    OwnSymbol{"cfm", "28.316846592 L/minute"},
    OwnSymbol{"cfs", "28.316846592 L/second"},
    OwnSymbol{"rpm", "1/minute"},
    OwnSymbol{"kWh", "3.6e6 J"},
    OwnSymbol{"MWh", "3.6e9 J"},
    OwnSymbol{"cP", "0.001 Pa.s"},
    OwnSymbol{"M", "1000 mol/m3"},
    OwnSymbol{"inH2O", "249.08891 Pa"},
    OwnSymbol{"mmH2O", "9.80665 Pa"},
    OwnSymbol{"hp", "745.6998715822702 W"},
    OwnSymbol{"meq", "0.001 mol"},
    OwnSymbol{"yr", "365.25 day"},
    OwnSymbol{"year", "365.25 day"},
    OwnSymbol{"years", "365.25 day"},
};

/// Longest unit that is looked at; the expressions and parsers below recurse with the length.
constexpr std::size_t kLongestUnit = 100;

std::string_view trimmed(std::string_view text) {
  const auto first = text.find_first_not_of(" \t\r\n");
  if (first == std::string_view::npos) return {};
  const auto last = text.find_last_not_of(" \t\r\n");
  return text.substr(first, last - first + 1);
}

/// Word processors write no-break spaces (U+00A0, U+202F) and thin spaces (U+2009): blanks to us.
std::string plain_blanks(std::string_view text) {
  std::string result(text);
  for (const std::string_view blank : {"\xC2\xA0", "\xE2\x80\xAF", "\xE2\x80\x89"}) {
    for (auto at = result.find(blank); at != std::string::npos; at = result.find(blank, at + 1)) {
      result.replace(at, blank.size(), " ");
    }
  }
  return result;
}

/// The unit as the parser needs it: "hp/1000 ft3" would be read as (hp/1000) ft3, and a normal
/// cubic metre (Nm3) as a cubed newton metre.
std::string prepared(std::string_view unit) {
  static const std::regex kPerThousand(R"(/ ?1000 ?(ft3|ft\^3|gal|m3))");
  static const std::regex kNormalCubicMetre("Nm(?=\\^?3|\xC2\xB3)");
  if (unit.size() > kLongestUnit) return std::string(unit);
  const std::string text = std::regex_replace(std::string(unit), kNormalCubicMetre, "m");
  return std::regex_replace(text, kPerThousand, "/(1000 $1)");
}

std::string not_known(std::string_view unit) {
  if (unit.size() > kLongestUnit) return fmt::format("a unit of {} characters", unit.size());
  return fmt::format("unit \"{}\" is not known", unit);
}

/// What the unit counts besides its dimension, in order: {"COD"} of "kg COD/m3"; taken out of it.
std::vector<std::string> take_species(std::string& unit) {
  static const std::regex kSpecies(
      R"(\b(kg|mg|g|kmol|mmol|mol|meq) ?(COD|CaCO3|VSS|VS|TSS|TS|C|N|S|P|H2S)(?![A-Za-z0-9]))");
  std::vector<std::string> species;
  std::smatch match;
  while (std::regex_search(unit, match, kSpecies)) {
    species.push_back(match[2]);
    unit = match.prefix().str() + match[1].str() + match.suffix().str();
  }
  return species;
}

}  // namespace

struct UnitReader::Impl {
  ut_system* system = nullptr;

  [[nodiscard]] Unit parse(std::string_view text) const {
    const std::string trimmed_text(trimmed(text));
    // Shifted and logarithmic units ("K @ 273.15", "lg(re 1 mW)") belong to no input of ours.
    const bool special = trimmed_text.find('@') != std::string::npos ||
                         trimmed_text.find("(re") != std::string::npos ||
                         trimmed_text.find('\0') != std::string::npos;
    if (special || trimmed_text.size() > kLongestUnit + 2) return nullptr;
    return Unit(ut_parse(system, trimmed_text.c_str(), UT_UTF8));
  }
  [[nodiscard]] Unit internal(Measure measure) const {
    return parse(std::string(internal_unit(measure)));
  }
  /// internal = scale * written + offset; empty when the two do not convert, or not linearly (a
  /// decibel), or not to a finite number.
  static std::optional<Scale> between(const Unit& from, const Unit& to) {
    if (!from || !to || ut_are_convertible(from.get(), to.get()) == 0) return std::nullopt;
    cv_converter* converter = ut_get_converter(from.get(), to.get());
    if (converter == nullptr) return std::nullopt;
    Scale scale;
    scale.offset = cv_convert_double(converter, 0.0);
    scale.scale = cv_convert_double(converter, 1.0) - scale.offset;
    const double at_1000 = cv_convert_double(converter, 1000.0);
    cv_free(converter);
    const double line_at_1000 = scale.offset + 1000.0 * scale.scale;
    const double slack = 1e-9 * (std::abs(scale.offset) + 1000.0 * std::abs(scale.scale));
    const bool linear = std::abs(at_1000 - line_at_1000) <= slack;  // false for NaN too
    if (!linear || !std::isfinite(scale.scale) || !(scale.scale > 0.0)) return std::nullopt;
    return scale;
  }
  /// "a flow" for "L/s"; empty when the unit fits none of our measures.
  [[nodiscard]] std::string_view what_it_measures(const Unit& unit) const {
    for (const Measure measure : kAllMeasures) {
      const Unit ours = internal(measure);
      if (ours && ut_are_convertible(unit.get(), ours.get()) != 0) return measure_name(measure);
    }
    return "something else";
  }
};

UnitReader::UnitReader() : impl_(std::make_unique<Impl>()) {
  ut_set_error_message_handler(ut_ignore);
  impl_->system = ut_read_xml(nullptr);
  if (impl_->system == nullptr) {
    ut_status status = UT_SUCCESS;
    const char* path = ut_get_path_xml(nullptr, &status);
    throw std::runtime_error(fmt::format(
        "the UDUNITS-2 unit database is missing or damaged (looked for {}). Install the "
        "package libudunits2-data, or set UDUNITS2_XML_PATH to udunits2.xml.",
        path != nullptr ? path : "udunits2.xml"));
  }
  for (const OwnSymbol& own : kOwnSymbols) {
    const Unit unit = impl_->parse(own.definition);
    if (!unit) throw std::runtime_error(fmt::format("unit {} cannot be defined", own.symbol));
    ut_unmap_name_to_unit(impl_->system, own.symbol, UT_ASCII);
    ut_unmap_symbol_to_unit(impl_->system, own.symbol, UT_ASCII);
    ut_map_symbol_to_unit(own.symbol, UT_ASCII, unit.get());
  }
}

UnitReader::~UnitReader() { ut_free_system(impl_->system); }

std::optional<UnitReader::Scale> UnitReader::scale_of(std::string_view unit, Measure measure,
                                                      std::string& problem) const {
  const std::string text = prepared(trimmed(plain_blanks(unit)));
  const std::string_view name = measure_name(measure);
  if (text.empty()) {
    problem = fmt::format("{} needs its unit", name);
    return std::nullopt;
  }
  if (measure == Measure::temperature || measure == Measure::temperature_change) {
    if (text == "C" || text == "F") {
      problem = fmt::format("unit \"{}\" is the {}, not a temperature", text,
                            text == "C" ? "coulomb" : "farad");
      return std::nullopt;
    }
  }
  if (measure == Measure::rotation && text.find("rad") != std::string::npos) {
    problem = fmt::format("\"{}\" counts radians, and revolutions are needed", text);
    return std::nullopt;
  }
  const Unit written = impl_->parse(text);
  if (!written) {
    problem = not_known(text);
    return std::nullopt;
  }
  auto scale = Impl::between(written, impl_->internal(measure));
  if (!scale) {
    problem = fmt::format("\"{}\" measures {}, and {} is needed", text,
                          impl_->what_it_measures(written), name);
    return std::nullopt;
  }
  if (measure == Measure::temperature_change) scale->offset = 0.0;
  if (measure != Measure::temperature && std::abs(scale->offset) > 0.0) {
    problem = fmt::format("\"{}\" has a zero of its own, and {} has none", text, name);
    return std::nullopt;
  }
  return scale;
}

std::optional<UnitReader::Scale> UnitReader::scale_between(std::string_view from,
                                                           std::string_view to,
                                                           std::string& problem) const {
  std::string source = prepared(trimmed(plain_blanks(from)));
  std::string target = prepared(trimmed(plain_blanks(to)));
  if (source.size() > kLongestUnit || target.size() > kLongestUnit) {
    problem = not_known(source.size() > kLongestUnit ? source : target);
    return std::nullopt;
  }
  const auto counted = take_species(source);
  const auto wanted = take_species(target);
  if (source.empty()) source = "1";
  if (target.empty() || target == "-") target = "1";
  const Unit source_unit = impl_->parse(source);
  if (!source_unit) {
    problem = not_known(from);
    return std::nullopt;
  }
  if (!counted.empty() && counted != wanted) {
    problem = fmt::format("\"{}\" does not count what \"{}\" counts", from, to);
    return std::nullopt;
  }
  const auto scale = Impl::between(source_unit, impl_->parse(target));
  if (!scale) problem = fmt::format("\"{}\" cannot be converted to \"{}\"", from, to);
  return scale;
}

UnitReading UnitReader::read(std::string_view written, Measure measure) const {
  const std::string blanks_plain = plain_blanks(written);
  std::string_view text = blanks_plain;
  UnitReading reading;
  const std::string_view name = measure_name(measure);
  reading.way_out = fmt::format("Write it as a number and one of {}.", example_units(measure));
  text = trimmed(text);
  double number = 0.0;
  const auto [end, error] = std::from_chars(text.data(), text.data() + text.size(), number);
  if (error == std::errc::result_out_of_range || (error == std::errc() && !std::isfinite(number))) {
    reading.problem = fmt::format("the number of {} must be finite", name);
    return reading;
  }
  if (error != std::errc()) {
    reading.problem = fmt::format("{} starts with a number", name);
    return reading;
  }
  std::string_view unit = text.substr(static_cast<std::size_t>(end - text.data()));
  if (!unit.empty() && (unit.front() == ',' || unit.front() == '\'' || unit.front() == '.')) {
    reading.problem = "numbers have a decimal point and no thousands separators";
    reading.way_out = "Write 1200.5, not 1,200.5 or 1.200,5.";
    return reading;
  }
  unit = trimmed(unit);
  const bool digits_first = !unit.empty() && unit.front() >= '0' && unit.front() <= '9';
  if (digits_first && unit.substr(0, 2) != "1/") {
    reading.problem = "numbers have no blanks inside";
    reading.way_out = "Write 1200, not 1 200.";
    return reading;
  }
  if (unit.empty() && measure == Measure::share) {
    reading.value = number;
    return reading;
  }
  const auto scale = scale_of(unit, measure, reading.problem);
  if (!scale) return reading;
  const double value = scale->scale * number + scale->offset;
  if (!std::isfinite(value)) {
    reading.problem = fmt::format("the number of {} must be finite", name);
  } else if (measure == Measure::temperature && value < 0.0) {
    reading.problem = "this is below absolute zero (-273.15 degC)";
  } else {
    reading.value = value;
  }
  return reading;
}

}  // namespace stillzone::core
