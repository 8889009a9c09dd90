// Finds out whether a WAV file ends before the sound its header promises; libsndfile does not say.
#pragma once

#include <cstdint>
#include <optional>

namespace unsoldered {

/// Bytes of the data chunk (RIFF, or RF64 with its ds64 chunk) that lie beyond the end of the file; empty when none are
/// missing, when the header leaves the length open (0 or all ones, as streaming writers do) or when it is no WAV file.
/// Reads with pread; the file position stays where it is.
std::optional<std::uint64_t> missing_wav_bytes(int descriptor) noexcept;

}  // namespace unsoldered
