// The file formats of clips and what each of them can hold, asked before anything is rendered.
//
//   wav   16, 24 bits or float; any rate and 1 to 8 channels of a take; RF64 when longer than 4 GiB
//   flac  16 or 24 bits; whole numbers only
//   mp3   lossy, 320 kbit/s or the most its rate has, nothing above 20 kHz; 1 or 2 channels, nine rates up to 48 kHz
//   ogg   lossy, Vorbis at its highest quality (up to 500 kbit/s in stereo); 1 or 2 channels, up to 200 kHz
//
// The lossy ones are set to the best they can do: a clip is there to hear small differences in treble, not to be small.
#pragma once

#include <optional>
#include <string>

#include "src/take.h"

namespace unsoldered {

enum class FileKind { wav, flac, mp3, ogg };
enum class Depth { pcm16, pcm24, float32 };

struct ClipFormat {
  FileKind kind = FileKind::wav;
  Depth depth = Depth::pcm24;  // without meaning in lossy formats
};

/// Decoding gives something near what was written, with peaks of its own.
bool is_lossy(FileKind kind) noexcept;

/// Samples are whole numbers, which end at full scale.
bool is_integer(const ClipFormat& format) noexcept;

/// ".wav"
const char* file_ending(FileKind kind) noexcept;

/// From --format and, when it was given, --depth (24 when not). Refuses unknown words, a depth the format does not have
/// and any depth for a lossy one. Throws InputError.
ClipFormat parse_clip_format(const std::string& format, const std::optional<std::string>& depth);

/// Refuses a rate or a number of channels that files of this kind cannot hold, with the kinds that can. Throws InputError.
void check_can_hold(FileKind kind, const TakeFormat& take);

}  // namespace unsoldered
