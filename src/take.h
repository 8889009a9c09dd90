// A take as rendering sees it: a stream of frames, wherever they come from.
#pragma once

#include <cstdint>
#include <memory>
#include <string>

namespace unsoldered {

struct TakeFormat {
  int rate_hz = 0;
  int channels = 0;
  std::int64_t frames = 0;  // as the header says; 0: it does not say. For progress and file sizes, not for memory
};

/// Read once from start to end by one thread; open another for another reader.
class Take {
 public:
  Take() = default;
  Take(const Take&) = delete;
  Take& operator=(const Take&) = delete;
  virtual ~Take() = default;

  virtual TakeFormat format() const noexcept = 0;

  /// Fills up to `frames` interleaved frames, full scale 1, every sample finite; returns how many, 0 at the end.
  /// Throws InputError where the take is damaged, CannotError where it cannot be read.
  virtual int read(double* interleaved, int frames) = 0;

  /// Frames that read() gives before the take begins, beyond those of format(): a filter that looks ahead answers early.
  virtual int lead_frames() const noexcept { return 0; }

  /// What the user should know though the take can be used; empty: nothing.
  virtual std::string warning() const { return {}; }
};

/// The word that stands for the phrase the program computes itself; a file of that name is `./built-in`.
inline constexpr const char* kBuiltInTake = "built-in";

/// A WAV (also RF64 and W64), AIFF or FLAC file, or the built-in phrase. Throws InputError or CannotError.
std::unique_ptr<Take> open_take(const std::string& name);

/// The take's name without folder and ending, as used in the names of clips.
std::string take_stem(const std::string& name);

}  // namespace unsoldered
