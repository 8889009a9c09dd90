// Reads a take from a WAV (plain, extensible, RF64), W64, AIFF or FLAC file through libsndfile, streamed.
//
// Nothing is sized by what the header claims. Other formats are refused right after opening, so that libsndfile's
// less trodden decoders are never run on files from elsewhere.
#pragma once

#include <filesystem>

#include "src/file_handle.h"
#include "src/take.h"

namespace unsoldered {

/// 1 to 8 channels, 8 to 384 kHz. A FLAC file that ends early is an error; any other that does is played as far as it
/// goes, with a warning.
class SoundFileTake : public Take {
 public:
  /// Throws InputError (missing, a folder, not sound, empty, out of bounds) or CannotError (no permission, I/O error).
  /// `kind` is what messages call it.
  explicit SoundFileTake(const std::filesystem::path& path, const std::string& kind = "take");

  TakeFormat format() const noexcept override { return format_; }
  int read(double* interleaved, int frames) override;
  std::string warning() const override { return warning_; }

 private:
  void check_samples(const double* interleaved, int frames) const;

  std::filesystem::path path_;
  std::string kind_;
  FileHandle descriptor_;  // outlives sound_
  SoundHandle sound_;
  TakeFormat format_;
  bool floating_ = false;  // samples may be anything
  std::int64_t frames_read_ = 0;
  std::string warning_;
};

}  // namespace unsoldered
