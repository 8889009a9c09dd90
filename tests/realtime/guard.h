// What an audio callback may not do, noticed: allocation and locks are counted, system calls end a child process.
#pragma once

#include <functional>

namespace unsoldered::test {

struct Counts {
  long allocations = 0;  // malloc, calloc, realloc, posix_memalign, aligned_alloc, free
  long locks = 0;        // pthread_mutex_lock, pthread_rwlock_*lock, pthread_cond_wait
};

/// What this thread does inside `work`.
Counts counted(const std::function<void()>& work);

/// Whether `work` runs to its end in a child that may not make any system call but read and write on what is open.
bool runs_without_system_calls(const std::function<void()>& work);

}  // namespace unsoldered::test
