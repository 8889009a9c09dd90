// Runs a number of independent tasks on a few threads.
#pragma once

#include <cstddef>
#include <functional>
#include <stop_token>

namespace unsoldered {

/// Calls task(0, token) … task(count - 1, token), at most `jobs` at a time, the calling thread among them. The first
/// exception requests a stop, which long tasks poll through `token` and then simply return; it is rethrown here when
/// all threads are done.
void run_tasks(std::size_t count, int jobs, const std::function<void(std::size_t, std::stop_token)>& task);

}  // namespace unsoldered
