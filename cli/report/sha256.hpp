#pragma once

#include <string>
#include <string_view>

namespace stillzone::cli {

/// SHA-256 of the bytes as 64 hexadecimal digits; what the common tools print for a file.
/// Source: FIPS PUB 180-4 (2015), Secure Hash Standard, sections 4.1.2, 4.2.2, 5 and 6.2.
[[nodiscard]] std::string sha256_hex(std::string_view bytes);

}  // namespace stillzone::cli
