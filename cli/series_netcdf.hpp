#pragma once

#include <filesystem>
#include <string>

#include "core/result.hpp"
#include "network/run_result.hpp"

namespace stillzone::cli {

/// series.nc: NetCDF-4 with CF-1.8 metadata. Dimensions time, zone, outlet, headspace, feed (those
/// that exist) and name_length; a variable per quantity, `zone_S_ac(time, zone)`; the places' names
/// as char(place, name_length).
/// Failure: what the library said of the file.
[[nodiscard]] core::Result<core::Done> write_series_netcdf(const std::filesystem::path& path,
                                                           const network::RunResult& result,
                                                           const std::string& title,
                                                           const std::string& history);

}  // namespace stillzone::cli
