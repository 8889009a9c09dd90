#include "src/tasks.h"

#include <algorithm>
#include <atomic>
#include <exception>
#include <mutex>
#include <system_error>
#include <thread>
#include <vector>

namespace unsoldered {

void run_tasks(std::size_t count, int jobs, const std::function<void(std::size_t, std::stop_token)>& task) {
  std::atomic<std::size_t> next{0};
  std::stop_source stop;
  std::mutex mutex;
  std::exception_ptr first;

  const auto work = [&] {
    while (!stop.stop_requested()) {
      const std::size_t index = next.fetch_add(1);
      if (index >= count) return;
      try {
        task(index, stop.get_token());
      } catch (...) {
        const std::lock_guard lock(mutex);
        if (!first) first = std::current_exception();
        stop.request_stop();
      }
    }
  };

  {
    std::vector<std::jthread> helpers;
    const std::size_t threads = std::min(count, static_cast<std::size_t>(std::max(jobs, 1)));
    try {
      while (helpers.size() + 1 < threads) helpers.emplace_back(work);
    } catch (const std::system_error&) {
      // The system grants no more threads: those there are do the work, only slower.
    }
    work();
  }
  if (first) std::rethrow_exception(first);
}

}  // namespace unsoldered
