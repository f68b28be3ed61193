#include "cli/series_netcdf.hpp"

#include <fmt/format.h>
#include <netcdf.h>

#include <algorithm>
#include <limits>
#include <map>
#include <regex>
#include <set>
#include <stdexcept>
#include <vector>

namespace stillzone::cli {
namespace {

/// A NetCDF call that failed; turned into a Failure at the end of this file.
class NetcdfError : public std::runtime_error {
 public:
  using std::runtime_error::runtime_error;
};

void checked(int status, const char* doing) {
  if (status != NC_NOERR) throw NetcdfError(fmt::format("{}: {}", doing, nc_strerror(status)));
}

/// What a unit counts (COD, C, N) is no part of a UDUNITS unit: it goes into the long name.
std::string plain_unit(const std::string& unit) {
  static const std::regex kCounted("(kg|g|mg|kmol|mol|mmol) ?(CaCO3|COD|VSS|VS|TS|C|N|S)\\b");
  const std::string plain = std::regex_replace(unit, kCounted, "$1");
  return plain == "-" || plain.empty() ? "1" : plain;
}

std::string variable_name(const std::string& kind, const std::string& quantity) {
  std::string name = kind + "_" + quantity;
  for (char& c : name) {
    const bool plain = (c >= '0' && c <= '9') || (c >= 'a' && c <= 'z') || (c >= 'A' && c <= 'Z');
    if (!plain) c = '_';
  }
  return name;
}

class SeriesFile {
 public:
  explicit SeriesFile(const std::filesystem::path& path) {
    checked(nc_create(path.c_str(), NC_NETCDF4 | NC_CLOBBER, &id_), "creating series.nc");
  }
  ~SeriesFile() {
    if (id_ >= 0) nc_close(id_);
  }
  SeriesFile(const SeriesFile&) = delete;
  SeriesFile& operator=(const SeriesFile&) = delete;

  void text(int variable, const char* name, const std::string& value) const {
    checked(nc_put_att_text(id_, variable, name, value.size(), value.c_str()), "writing metadata");
  }
  [[nodiscard]] int dimension(const std::string& name, std::size_t size) const {
    int dimension = 0;
    checked(nc_def_dim(id_, name.c_str(), size, &dimension), "defining a dimension");
    return dimension;
  }
  [[nodiscard]] int variable(const std::string& name, nc_type type,
                             const std::vector<int>& dimensions) const {
    int variable = 0;
    checked(nc_def_var(id_, name.c_str(), type, static_cast<int>(dimensions.size()),
                       dimensions.data(), &variable),
            "defining a variable");
    if (type == NC_DOUBLE) {
      checked(nc_def_var_deflate(id_, variable, 1, 1, 4), "setting compression");
    }
    return variable;
  }
  void doubles(int variable, const std::vector<double>& values) const {
    checked(nc_put_var_double(id_, variable, values.data()), "writing values");
  }
  void characters(int variable, const std::string& values) const {
    checked(nc_put_var_text(id_, variable, values.data()), "writing names");
  }
  void close() {
    const int id = id_;
    id_ = -1;
    checked(nc_close(id), "closing series.nc");
  }

 private:
  int id_ = -1;
};

using Column = network::Series::Column;

/// The columns of one kind of place, by place and quantity.
struct PlaceKind {
  std::string name;
  std::vector<std::string> places;
  std::vector<std::string> quantities;
  std::map<std::pair<std::string, std::string>, const Column*> columns;
};

std::string kind_of(const std::string& place, const network::RunResult& result) {
  const auto has = [&](const auto& list, auto name) {
    return std::any_of(list.begin(), list.end(), [&](const auto& e) { return name(e) == place; });
  };
  if (has(result.zones, [](const auto& e) { return e.place; })) return "zone";
  if (has(result.outlets, [](const auto& e) { return e.name; })) return "outlet";
  if (has(result.headspaces, [](const auto& e) { return e.name; })) return "headspace";
  return "feed";
}

std::vector<PlaceKind> by_kind(const network::RunResult& result) {
  std::vector<PlaceKind> kinds = {{"zone", {}, {}, {}},
                                  {"outlet", {}, {}, {}},
                                  {"headspace", {}, {}, {}},
                                  {"feed", {}, {}, {}}};
  const auto add_once = [](std::vector<std::string>& list, const std::string& name) {
    if (std::find(list.begin(), list.end(), name) == list.end()) list.push_back(name);
  };
  for (const Column& column : result.series.columns) {
    const std::string kind = kind_of(column.place, result);
    for (PlaceKind& candidate : kinds) {
      if (candidate.name != kind) continue;
      add_once(candidate.places, column.place);
      add_once(candidate.quantities, column.quantity);
      candidate.columns[{column.place, column.quantity}] = &column;
    }
  }
  std::erase_if(kinds, [](const PlaceKind& kind) { return kind.places.empty(); });
  return kinds;
}

void write_names(const SeriesFile& file, const PlaceKind& kind, int place_dimension,
                 int length_dimension, std::size_t length) {
  const int variable =
      file.variable(kind.name + "_name", NC_CHAR, {place_dimension, length_dimension});
  file.text(variable, "long_name", "name of the " + kind.name);
  std::string names;
  for (std::string name : kind.places) {
    name.resize(length, '\0');
    names += name;
  }
  file.characters(variable, names);
}

void write_kind(const SeriesFile& file, const PlaceKind& kind, const network::Series& series,
                int time_dimension, int length_dimension, std::size_t length) {
  const int place_dimension = file.dimension(kind.name, kind.places.size());
  write_names(file, kind, place_dimension, length_dimension, length);
  for (const std::string& quantity : kind.quantities) {
    const int variable = file.variable(variable_name(kind.name, quantity), NC_DOUBLE,
                                       {time_dimension, place_dimension});
    std::vector<double> values(series.time.size() * kind.places.size(),
                               std::numeric_limits<double>::quiet_NaN());
    std::string unit;
    for (std::size_t p = 0; p < kind.places.size(); ++p) {
      const auto found = kind.columns.find({kind.places[p], quantity});
      if (found == kind.columns.end()) continue;
      unit = found->second->unit;
      for (std::size_t i = 0; i < series.time.size(); ++i) {
        values[i * kind.places.size() + p] = found->second->values[i];
      }
    }
    file.text(variable, "units", plain_unit(unit));
    file.text(variable, "long_name", quantity + " [" + unit + "]");
    file.text(variable, "coordinates", kind.name + "_name");
    file.doubles(variable, values);
  }
}

}  // namespace

core::Result<core::Done> write_series_netcdf(const std::filesystem::path& path,
                                             const network::RunResult& result,
                                             const std::string& title, const std::string& history) {
  try {
    SeriesFile file(path);
    file.text(NC_GLOBAL, "Conventions", "CF-1.8");
    file.text(NC_GLOBAL, "title", title);
    file.text(NC_GLOBAL, "source", "Stillzone " STILLZONE_VERSION);
    file.text(NC_GLOBAL, "history", history);
    const int time_dimension = file.dimension("time", result.series.time.size());
    const int time = file.variable("time", NC_DOUBLE, {time_dimension});
    file.text(time, "units", "days since 2000-01-01 00:00:00");
    file.text(time, "long_name", "time since the start of the run, laid at an arbitrary date");
    file.text(time, "standard_name", "time");
    file.text(time, "axis", "T");
    file.text(time, "calendar", "standard");
    file.doubles(time, result.series.time);
    std::size_t length = 1;
    const auto kinds = by_kind(result);
    for (const PlaceKind& kind : kinds) {
      for (const std::string& name : kind.places) length = std::max(length, name.size());
    }
    const int length_dimension = file.dimension("name_length", length);
    for (const PlaceKind& kind : kinds) {
      write_kind(file, kind, result.series, time_dimension, length_dimension, length);
    }
    file.close();
  } catch (const NetcdfError& error) {
    return core::Failure{.reason = fmt::format("series.nc: {}", error.what()),
                         .try_this = "Check the free space and the permissions of the folder."};
  }
  return core::Done{};
}

}  // namespace stillzone::cli
