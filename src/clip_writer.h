// Writes one clip, streamed: integer samples are rounded, clipped and (16 bits) dithered here, in wide loops, and handed
// to libsndfile as they will stand in the file. Lossy formats are handed floats.
//
// 24 bits are rounded without dither: the error, -146 dBFS, lies far under the noise of any recording.
//
// Files are reproducible byte for byte (no PEAK chunk, which carries a time stamp); Ogg files in their samples, for the
// library gives each stream a number of its own. WAV longer than 4 GiB: RF64.
#pragma once

#include <cstdint>
#include <filesystem>
#include <string>
#include <vector>

#include "src/clip_format.h"
#include "src/dither.h"
#include "src/file_handle.h"
#include "src/take.h"

namespace unsoldered {

/// What a file says about itself where its format has a place for it; UTF-8.
struct ClipText {
  std::string title = {};
  std::string comment = {};
};

class ClipWriter {
 public:
  /// Creates `path`, which must not exist. `name` is what messages call the clip and what seeds its dither.
  /// `take.frames` decides between plain WAV and RF64 (0, unknown: RF64 that turns into WAV when short). The format can
  /// hold the take: check_can_hold. Throws CannotError with the system's reason.
  ClipWriter(const std::filesystem::path& path, std::string name, TakeFormat take, ClipFormat format,
             const ClipText& text = {});

  /// Appends planar frames times `gain`, full scale 1. Throws CannotError: disk full, or a sample that is not finite.
  void write(const double* const* channels, int frames, double gain);

  /// Completes the file. Throws CannotError. Not called: the file stays incomplete, for the owner of the path to remove.
  void close();

  /// Largest magnitude among the samples as written (lossy: as handed to the encoder), full scale 1.
  double peak() const noexcept { return peak_; }

 private:
  void describe(const ClipText& text);
  void write_integers(const double* const* channels, int frames, double gain);
  bool quantise(const double* from, double factor, double scale, std::size_t channel) noexcept;  // to whole_; finite?
  void write_floats(const double* const* channels, int frames, double gain);
  void check_written(bool complete) const;
  [[noreturn]] void refuse(const double* const* channels, int frames, double gain) const;
  [[noreturn]] void failed(const std::string& reason) const;
  [[noreturn]] void failed_in_system(int error) const;  // errno; 0: not known

  std::string name_;
  std::filesystem::path folder_;  // for messages
  FileHandle descriptor_;         // outlives sound_
  SoundHandle sound_;
  int channels_;
  ClipFormat format_;
  std::vector<TriangularDither> dither_;  // one a channel
  std::int64_t frames_written_ = 0;
  double peak_ = 0;
  std::vector<std::int32_t> whole_;
  std::vector<unsigned char> bytes_;  // WAV
  std::vector<std::int32_t> wide_;    // FLAC
  std::vector<float> floats_;
};

}  // namespace unsoldered
