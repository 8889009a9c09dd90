// Owners of a file descriptor and of a libsndfile handle.
#pragma once

#include <sndfile.h>
#include <unistd.h>

#include <memory>
#include <utility>

namespace unsoldered {

class FileHandle {
 public:
  explicit FileHandle(int descriptor = -1) noexcept : descriptor_(descriptor) {}
  FileHandle(FileHandle&& other) noexcept : descriptor_(std::exchange(other.descriptor_, -1)) {}
  FileHandle& operator=(FileHandle&& other) noexcept {
    std::swap(descriptor_, other.descriptor_);
    return *this;
  }
  ~FileHandle() {
    if (descriptor_ >= 0) ::close(descriptor_);
  }

  int get() const noexcept { return descriptor_; }

  /// Closes now; false, with errno set, when the system reports that what was written may be lost.
  bool close() noexcept { return ::close(std::exchange(descriptor_, -1)) == 0; }

 private:
  int descriptor_;
};

struct SoundCloser {
  void operator()(SNDFILE* file) const noexcept { sf_close(file); }
};
using SoundHandle = std::unique_ptr<SNDFILE, SoundCloser>;

}  // namespace unsoldered
