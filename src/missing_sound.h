// Finds out whether a WAV, W64 or AIFF file ends before the sound its header promises; libsndfile does not say.
#pragma once

#include <cstdint>
#include <optional>

namespace unsoldered {

/// Bytes of sound (RIFF's data chunk, or RF64 with its ds64 chunk; W64; AIFF and AIFF-C) that lie beyond the end of the
/// file; empty when none are missing, when the header leaves the length open (0 or all ones, as streaming writers do) or
/// when it is none of these files. Reads with pread; the file position stays where it is.
std::optional<std::uint64_t> missing_sound_bytes(int descriptor) noexcept;

}  // namespace unsoldered
