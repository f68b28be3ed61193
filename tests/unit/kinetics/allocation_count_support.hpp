#pragma once

#include <cstddef>

namespace stillzone::kinetics {

/// Calls of operator new in this program so far.
[[nodiscard]] std::size_t n_allocations();

}  // namespace stillzone::kinetics
