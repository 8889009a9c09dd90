// A lossy clip as a player will hear it: decoded again after it was written.
#pragma once

#include <cstdint>
#include <filesystem>

namespace unsoldered {

struct DecodedClip {
  std::int64_t frames = 0;
  double true_peak = 0;  // full scale 1
};

/// Throws CannotError, its message with `name`.
DecodedClip measure_decoded(const std::filesystem::path& path, const std::string& name);

}  // namespace unsoldered
