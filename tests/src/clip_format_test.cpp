#include "src/clip_format.h"

#include "dsp/error.h"
#include "tests/catch.h"
#include "tests/src/sound_fixture.h"

using Catch::Matchers::ContainsSubstring;
using unsoldered::Depth;
using unsoldered::FileKind;
using unsoldered::InputError;
using unsoldered::parse_clip_format;
using unsoldered::test::message_of;

namespace {

std::string refusal(const std::string& format, const std::optional<std::string>& depth) {
  return message_of<InputError>([&] { parse_clip_format(format, depth); });
}

std::string refusal(FileKind kind, int rate_hz, int channels) {
  return message_of<InputError>([&] { check_can_hold(kind, {rate_hz, channels, 1000}); });
}

}  // namespace

TEST_CASE("Formats and depths are named as files are, 24 bits unless said otherwise") {
  CHECK(parse_clip_format("wav", std::nullopt).kind == FileKind::wav);
  CHECK(parse_clip_format("flac", std::nullopt).kind == FileKind::flac);
  CHECK(parse_clip_format("mp3", std::nullopt).kind == FileKind::mp3);
  CHECK(parse_clip_format("ogg", std::nullopt).kind == FileKind::ogg);
  CHECK(parse_clip_format("wav", std::nullopt).depth == Depth::pcm24);
  CHECK(parse_clip_format("wav", "16").depth == Depth::pcm16);
  CHECK(parse_clip_format("wav", "float").depth == Depth::float32);
  CHECK(parse_clip_format("flac", "24").depth == Depth::pcm24);
  CHECK(file_ending(FileKind::flac) == std::string(".flac"));
  CHECK_THAT(refusal("WAV", std::nullopt), ContainsSubstring("\"WAV\"") && ContainsSubstring("wav, flac, mp3 or ogg"));
  CHECK_THAT(refusal("wav", "32"), ContainsSubstring("--depth") && ContainsSubstring("16, 24 or float"));
  CHECK_THAT(refusal("flac", "float"), ContainsSubstring("--depth 16 or 24") && ContainsSubstring("--format wav"));
  for (const char* lossy : {"mp3", "ogg"}) {
    for (const char* depth : {"16", "24", "float"}) {
      CHECK_THAT(refusal(lossy, depth), ContainsSubstring("leave --depth away") && ContainsSubstring("wav or flac"));
    }
  }
}

TEST_CASE("A rate or number of channels that a format cannot hold is refused with the formats that can") {
  for (const int rate : {8000, 11025, 12000, 16000, 22050, 24000, 32000, 44100, 48000}) {
    for (const FileKind kind : {FileKind::wav, FileKind::flac, FileKind::mp3, FileKind::ogg}) {
      CHECK(refusal(kind, rate, 2).empty());
    }
  }
  CHECK_THAT(refusal(FileKind::mp3, 96000, 1), ContainsSubstring("96000 Hz") &&
                                                   ContainsSubstring("44100 or 48000 Hz") &&
                                                   ContainsSubstring("--format wav, flac or ogg"));
  CHECK_THAT(refusal(FileKind::mp3, 37800, 1), ContainsSubstring("37800 Hz"));
  CHECK_THAT(refusal(FileKind::mp3, 48000, 3),
             ContainsSubstring("3 channels") && ContainsSubstring("1 or 2") && ContainsSubstring("wav or flac"));
  CHECK(refusal(FileKind::ogg, 200000, 2).empty());
  CHECK_THAT(refusal(FileKind::ogg, 48000, 6), ContainsSubstring("6 channels") && ContainsSubstring("wav or flac"));
  CHECK_THAT(refusal(FileKind::ogg, 200001, 1), ContainsSubstring("200000 Hz") && ContainsSubstring("wav or flac"));
  CHECK(refusal(FileKind::flac, 384000, 8).empty());
  CHECK(refusal(FileKind::wav, 384000, 8).empty());
}
