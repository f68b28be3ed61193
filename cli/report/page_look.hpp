#pragma once

#include <string_view>

namespace stillzone::cli {

/// The style sheet of every report: screen, dark, narrow and paper. Colours are our own; k0..k7 are
/// told apart by lightness too, dashes d0..d4 and markers do the same in grey print.
[[nodiscard]] std::string_view page_style();

/// The script of every report, an enhancement only: hover values, zoom along x by dragging, reset.
[[nodiscard]] std::string_view page_script();

}  // namespace stillzone::cli
