#include "src/progress.h"

#include <unistd.h>

#include <algorithm>
#include <cmath>
#include <utility>

namespace unsoldered {
namespace {

constexpr std::int64_t kBetweenLinesMs = 100;
constexpr const char* kEraseLine = "\r\x1b[K";  // ECMA-48: to the line's start, erase to its end

std::string clock_text(double seconds) {
  const auto whole = static_cast<long>(std::ceil(seconds));
  const auto two = [](long number) { return (number < 10 ? "0" : "") + std::to_string(number); };
  if (whole < 3600) return std::to_string(whole / 60) + ':' + two(whole % 60);
  return std::to_string(whole / 3600) + ':' + two(whole / 60 % 60) + ':' + two(whole % 60);
}

}  // namespace

std::string progress_line(const std::string& label, double done, double total, double elapsed_seconds) {
  constexpr int kWidth = 20;
  const double share = std::clamp(done / total, 0.0, 1.0);
  const auto full = static_cast<std::size_t>(share * kWidth);
  const std::string percent = std::to_string(static_cast<int>(share * 100));
  std::string line = label + " [" + std::string(full, '#') + std::string(kWidth - full, '-') + "] " +
                     std::string(3 - std::min<std::size_t>(percent.size(), 3), ' ') + percent + " %";
  if (share > 0) line += "  " + clock_text(elapsed_seconds * (1 - share) / share) + " left";
  return line;
}

Progress::Progress(std::string label, std::FILE* stream)
    : label_(std::move(label)), stream_(::isatty(::fileno(stream)) == 1 ? stream : nullptr) {}

Progress::~Progress() {
  if (shown_) {
    std::fputs(kEraseLine, stream_);
    std::fflush(stream_);
  }
}

void Progress::advance(std::int64_t done) {
  done_.fetch_add(done, std::memory_order_relaxed);
  if (stream_ == nullptr) return;
  const auto elapsed = std::chrono::steady_clock::now() - start_;
  const auto now_ms = std::chrono::duration_cast<std::chrono::milliseconds>(elapsed).count();
  std::int64_t due_ms = next_ms_.load(std::memory_order_relaxed);
  if (now_ms >= due_ms && next_ms_.compare_exchange_strong(due_ms, now_ms + kBetweenLinesMs)) show(now_ms);
}

void Progress::show(std::int64_t now_ms) {
  const auto total = static_cast<double>(total_.load(std::memory_order_relaxed));
  if (!(total > 0)) return;
  const auto done = static_cast<double>(done_.load(std::memory_order_relaxed));
  const std::string line = kEraseLine + progress_line(label_, done, total, static_cast<double>(now_ms) / 1000);
  const std::lock_guard lock(mutex_);
  std::fputs(line.c_str(), stream_);
  std::fflush(stream_);
  shown_ = true;
}

}  // namespace unsoldered
