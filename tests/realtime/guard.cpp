#include "tests/realtime/guard.h"

#include <dlfcn.h>
#include <linux/seccomp.h>
#include <pthread.h>
#include <sys/prctl.h>
#include <sys/syscall.h>
#include <sys/wait.h>
#include <unistd.h>

#include <cstddef>

namespace {

thread_local bool counting = false;
thread_local unsoldered::test::Counts counts;

void allocation() noexcept {
  if (counting) ++counts.allocations;
}

}  // namespace

// The C library's own, under the names that stay when ours take the usual ones.
extern "C" {
void* __libc_malloc(std::size_t size);
void* __libc_calloc(std::size_t count, std::size_t size);
void* __libc_realloc(void* memory, std::size_t size);
void* __libc_memalign(std::size_t alignment, std::size_t size);
void __libc_free(void* memory);

void* malloc(std::size_t size) {
  allocation();
  return __libc_malloc(size);
}
void* calloc(std::size_t count, std::size_t size) {
  allocation();
  return __libc_calloc(count, size);
}
void* realloc(void* memory, std::size_t size) {
  allocation();
  return __libc_realloc(memory, size);
}
int posix_memalign(void** memory, std::size_t alignment, std::size_t size) {
  allocation();
  *memory = __libc_memalign(alignment, size);
  return *memory == nullptr ? 12 : 0;  // ENOMEM
}
void* aligned_alloc(std::size_t alignment, std::size_t size) {
  allocation();
  return __libc_memalign(alignment, size);
}
void free(void* memory) {
  allocation();
  __libc_free(memory);
}

int pthread_mutex_lock(pthread_mutex_t* mutex) {
  using Lock = int (*)(pthread_mutex_t*);
  static const auto lock = reinterpret_cast<Lock>(dlsym(RTLD_NEXT, "pthread_mutex_lock"));
  if (counting) ++counts.locks;
  return lock(mutex);
}
int pthread_rwlock_rdlock(pthread_rwlock_t* mutex) {
  using Lock = int (*)(pthread_rwlock_t*);
  static const auto lock = reinterpret_cast<Lock>(dlsym(RTLD_NEXT, "pthread_rwlock_rdlock"));
  if (counting) ++counts.locks;
  return lock(mutex);
}
int pthread_rwlock_wrlock(pthread_rwlock_t* mutex) {
  using Lock = int (*)(pthread_rwlock_t*);
  static const auto lock = reinterpret_cast<Lock>(dlsym(RTLD_NEXT, "pthread_rwlock_wrlock"));
  if (counting) ++counts.locks;
  return lock(mutex);
}
}

namespace unsoldered::test {

Counts counted(const std::function<void()>& work) {
  counts = {};
  counting = true;
  work();
  counting = false;
  return counts;
}

bool runs_without_system_calls(const std::function<void()>& work) {
  const pid_t child = fork();
  if (child == 0) {
    if (prctl(PR_SET_SECCOMP, SECCOMP_MODE_STRICT) != 0) _exit(77);
    work();
    syscall(SYS_exit, 42);  // _exit() would end the whole group, a call that is not allowed
  }
  int status = 0;
  return child > 0 && waitpid(child, &status, 0) == child && WIFEXITED(status) && WEXITSTATUS(status) == 42;
}

}  // namespace unsoldered::test
