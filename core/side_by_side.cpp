#include "core/side_by_side.hpp"

#include <algorithm>
#include <atomic>
#include <exception>
#include <mutex>
#include <thread>
#include <vector>

namespace stillzone::core {

void side_by_side(std::size_t n, int threads, const std::function<void(std::size_t)>& job) {
  const std::size_t wanted = threads > 0 ? static_cast<std::size_t>(threads)
                                         : std::max(1U, std::thread::hardware_concurrency());
  std::atomic<std::size_t> next{0};
  std::mutex mutex;
  std::exception_ptr first;
  const auto work = [&] {
    for (std::size_t i = next++; i < n; i = next++) {
      try {
        job(i);
      } catch (...) {
        const std::lock_guard lock(mutex);
        if (!first) first = std::current_exception();
      }
    }
  };
  {
    std::vector<std::jthread> others;
    for (std::size_t k = 1; k < std::min(wanted, n); ++k) others.emplace_back(work);
    work();
  }
  if (first) std::rethrow_exception(first);
}

}  // namespace stillzone::core
