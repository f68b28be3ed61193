#pragma once

#include <cstddef>
#include <functional>

namespace stillzone::core {

/// Calls job(i) for i = 0 .. n - 1 on up to `threads` threads (0: one per processor) and returns
/// when all are done. Jobs must not share what they change; each writes to its own place, so the
/// results do not depend on the number of threads. The first exception is passed on at the end.
void side_by_side(std::size_t n, int threads, const std::function<void(std::size_t)>& job);

}  // namespace stillzone::core
