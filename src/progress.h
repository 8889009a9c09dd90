// A progress bar with percentage and time left, on a terminal only.
#pragma once

#include <atomic>
#include <chrono>
#include <cstdint>
#include <cstdio>
#include <mutex>
#include <string>

namespace unsoldered {

/// The line to show: "rendering [#######-------------]  35 %  0:12 left". `done` and `total` in any unit, total > 0.
std::string progress_line(const std::string& label, double done, double total, double elapsed_seconds);

/// At most ten lines a second, the first after a fifth of a second, each over the last; removed at destruction.
class Progress {
 public:
  /// `stream` is watched for being a terminal; on anything else nothing is ever written.
  Progress(std::string label, std::FILE* stream);
  Progress(const Progress&) = delete;
  Progress& operator=(const Progress&) = delete;
  ~Progress();

  /// Before the work, and again when more turns up. Any thread.
  void expect(std::int64_t more) noexcept { total_.fetch_add(more, std::memory_order_relaxed); }

  /// Any thread.
  void advance(std::int64_t done);

 private:
  void show(std::int64_t now_ms);

  std::string label_;
  std::FILE* stream_;  // null: not a terminal
  std::chrono::steady_clock::time_point start_ = std::chrono::steady_clock::now();
  std::atomic<std::int64_t> total_{0};
  std::atomic<std::int64_t> done_{0};
  std::atomic<std::int64_t> next_ms_{200};
  std::mutex mutex_;
  bool shown_ = false;
};

}  // namespace unsoldered
