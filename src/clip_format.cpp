#include "src/clip_format.h"

#include <algorithm>
#include <array>
#include <string_view>
#include <vector>

#include "dsp/error.h"
#include "src/number_text.h"

namespace unsoldered {
namespace {

// MPEG-1 layer III (ISO 11172-3), its half rates (ISO 13818-3) and the quarter rates every decoder knows.
constexpr std::array<int, 9> kMp3Rates = {8000, 11025, 12000, 16000, 22050, 24000, 32000, 44100, 48000};
// Vorbis gives channels beyond the second places of its own (the second of three is the centre), and its encoder takes
// the sixth of six for a bass channel and keeps nothing above its lowest octaves: no place for a take's channels.
constexpr int kMostLossyChannels = 2;
// The Vorbis encoder has no tuning above; libsndfile opens such a file all the same and writes nothing into it.
constexpr int kMostVorbisRate = 200000;

struct Kind {
  FileKind kind;
  std::string_view word;
  const char* name;  // with its article
  const char* ending;
};
constexpr std::array<Kind, 4> kKinds = {{{FileKind::wav, "wav", "a WAV file", ".wav"},
                                         {FileKind::flac, "flac", "a FLAC file", ".flac"},
                                         {FileKind::mp3, "mp3", "an MP3 file", ".mp3"},
                                         {FileKind::ogg, "ogg", "an Ogg Vorbis file", ".ogg"}}};

const Kind& about(FileKind kind) noexcept { return kKinds[static_cast<std::size_t>(kind)]; }

bool holds_rate(FileKind kind, int rate_hz) noexcept {
  if (kind == FileKind::ogg) return rate_hz <= kMostVorbisRate;
  return kind != FileKind::mp3 || std::find(kMp3Rates.begin(), kMp3Rates.end(), rate_hz) != kMp3Rates.end();
}

bool holds_channels(FileKind kind, int channels) noexcept { return !is_lossy(kind) || channels <= kMostLossyChannels; }

std::string rates_of(FileKind kind) {
  if (kind == FileKind::ogg) return "rates up to " + std::to_string(kMostVorbisRate) + " Hz";
  std::vector<std::string> rates;
  for (const int rate : kMp3Rates) rates.push_back(std::to_string(rate));
  return in_a_row(rates, "or") + " Hz";
}

std::string usable_formats(const TakeFormat& take) {
  std::vector<std::string> words;
  for (const Kind& kind : kKinds) {
    if (holds_rate(kind.kind, take.rate_hz) && holds_channels(kind.kind, take.channels)) words.emplace_back(kind.word);
  }
  return "--format " + in_a_row(words, "or");
}

Depth parse_depth(const std::string& text) {
  if (text == "16") return Depth::pcm16;
  if (text == "24") return Depth::pcm24;
  if (text == "float") return Depth::float32;
  throw InputError("--depth: \"" + text + "\" is not a depth; give 16, 24 or float");
}

}  // namespace

bool is_lossy(FileKind kind) noexcept { return kind == FileKind::mp3 || kind == FileKind::ogg; }

bool is_integer(const ClipFormat& format) noexcept { return !is_lossy(format.kind) && format.depth != Depth::float32; }

const char* file_ending(FileKind kind) noexcept { return about(kind).ending; }

ClipFormat parse_clip_format(const std::string& format, const std::optional<std::string>& depth) {
  const auto* found = std::find_if(kKinds.begin(), kKinds.end(), [&](const Kind& kind) { return kind.word == format; });
  if (found == kKinds.end()) {
    throw InputError("--format: \"" + format + "\" is not a format of clips; give wav, flac, mp3 or ogg");
  }
  ClipFormat result{found->kind, Depth::pcm24};
  if (!depth) return result;
  result.depth = parse_depth(*depth);
  if (is_lossy(result.kind)) {
    throw InputError("--format " + format + " --depth " + *depth + ": " + found->name +
                     " has no bits a sample to choose; leave --depth away, or give --format wav or flac");
  }
  if (result.kind == FileKind::flac && result.depth == Depth::float32) {
    throw InputError(
        "--format flac --depth float: a FLAC file holds whole numbers only; give --depth 16 or 24, or "
        "--format wav");
  }
  return result;
}

void check_can_hold(FileKind kind, const TakeFormat& take) {
  const std::string where = "--format " + std::string(about(kind).word) + ": the take has ";
  if (!holds_channels(kind, take.channels)) {
    throw InputError(where + std::to_string(take.channels) + " channels; " + about(kind).name + " holds 1 or " +
                     std::to_string(kMostLossyChannels) + ", so give " + usable_formats(take) +
                     ", or mix the take down first");
  }
  if (!holds_rate(kind, take.rate_hz)) {
    throw InputError(where + "a sample rate of " + std::to_string(take.rate_hz) + " Hz; " + about(kind).name +
                     " holds " + rates_of(kind) + ", so give " + usable_formats(take) + ", or resample the take first");
  }
}

}  // namespace unsoldered
