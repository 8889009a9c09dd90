// Ctrl-C: long work polls, tidies up and throws; main() turns that into exit status 130.
#pragma once

namespace unsoldered {

struct Interrupted {};

/// Installs the handler for SIGINT, SIGTERM and SIGHUP, and lets the file size limit be an error. Main thread, once.
void watch_for_interrupt();

/// True after the first signal. Any thread.
bool interrupted() noexcept;

/// Throws Interrupted when interrupted().
void stop_if_interrupted();

}  // namespace unsoldered
