#include "src/cancel.h"

#include <atomic>
#include <csignal>

namespace unsoldered {
namespace {

// A signal handler can reach nothing but an object of static life; this flag is the program's only one.
std::atomic<bool> signal_came{false};
static_assert(std::atomic<bool>::is_always_lock_free, "a signal handler may only touch lock-free atomics");

constexpr int kAsks[] = {SIGINT, SIGTERM, SIGHUP};  // Ctrl-C, a polite kill, a terminal that was closed

extern "C" void note_signal(int) {
  signal_came.store(true, std::memory_order_relaxed);
  // A second signal ends the program at once: whoever asks twice does not want to wait for the tidying.
  for (const int number : kAsks) std::signal(number, SIG_DFL);
}

}  // namespace

void watch_for_interrupt() {
  struct sigaction action {};
  action.sa_handler = note_signal;
  action.sa_flags = SA_RESTART;  // reads and writes under way are finished; the flag is polled between them
  sigemptyset(&action.sa_mask);
  for (const int number : kAsks) {
    struct sigaction before {};
    // A signal ignored from outside (nohup, a background job of a shell script) stays ignored.
    if (sigaction(number, nullptr, &before) == 0 && before.sa_handler == SIG_IGN) continue;
    sigaction(number, &action, nullptr);
  }
  // A file larger than the user's limit is then an error of its write, not the end of the program with half a file.
  std::signal(SIGXFSZ, SIG_IGN);
}

bool interrupted() noexcept { return signal_came.load(std::memory_order_relaxed); }

void stop_if_interrupted() {
  if (interrupted()) throw Interrupted{};
}

}  // namespace unsoldered
