#include "src/sound_file.h"

#include <sys/resource.h>
#include <sys/stat.h>

#include <algorithm>
#include <cmath>
#include <csignal>
#include <cstdlib>
#include <limits>

#include "dsp/error.h"
#include "src/clip_writer.h"
#include "tests/catch.h"
#include "tests/src/sound_fixture.h"

using Catch::Matchers::ContainsSubstring;
using Catch::Matchers::WithinAbs;
using namespace unsoldered::test;
using unsoldered::CannotError;
using unsoldered::ClipFormat;
using unsoldered::ClipText;
using unsoldered::ClipWriter;
using unsoldered::Depth;
using unsoldered::FileKind;
using unsoldered::InputError;
using unsoldered::SoundFileTake;

namespace {

std::vector<double> read_all(unsoldered::Take& take, int block) {
  const auto channels = static_cast<std::size_t>(take.format().channels);
  std::vector<double> part(static_cast<std::size_t>(block) * channels);
  std::vector<double> all;
  while (const int frames = take.read(part.data(), block)) {
    all.insert(all.end(), part.begin(), part.begin() + static_cast<std::ptrdiff_t>(channels) * frames);
  }
  return all;
}

std::string refusal(const std::filesystem::path& path) {
  return message_of<InputError>([&] {
    SoundFileTake take(path);
    read_all(take, 1000);
  });
}

/// One channel through a writer, as it stands in the file.
std::vector<double> written(const std::filesystem::path& path, Depth depth, const std::vector<double>& samples,
                            double gain = 1, const std::string& name = "clip.wav") {
  ClipWriter writer(path, name, {48000, 1, static_cast<std::int64_t>(samples.size())}, {FileKind::wav, depth});
  const double* channel = samples.data();
  writer.write(&channel, static_cast<int>(samples.size()), gain);
  writer.close();
  return read_sound(path).samples;
}

}  // namespace

TEST_CASE("Takes in WAV, FLAC, AIFF and W64 come back sample for sample in blocks of any size") {
  const TemporaryFolder folder;
  for (const int format :
       {SF_FORMAT_WAV | SF_FORMAT_PCM_16, SF_FORMAT_WAV | SF_FORMAT_PCM_24, SF_FORMAT_WAV | SF_FORMAT_FLOAT,
        SF_FORMAT_WAV | SF_FORMAT_DOUBLE, SF_FORMAT_WAV | SF_FORMAT_PCM_U8, SF_FORMAT_WAVEX | SF_FORMAT_PCM_24,
        SF_FORMAT_W64 | SF_FORMAT_PCM_16, SF_FORMAT_W64 | SF_FORMAT_FLOAT, SF_FORMAT_AIFF | SF_FORMAT_PCM_S8,
        SF_FORMAT_AIFF | SF_FORMAT_PCM_16, SF_FORMAT_AIFF | SF_FORMAT_PCM_24, SF_FORMAT_AIFF | SF_FORMAT_FLOAT,
        SF_FORMAT_AIFF | SF_FORMAT_PCM_16 | SF_ENDIAN_LITTLE, SF_FORMAT_AIFF | SF_FORMAT_ULAW,
        SF_FORMAT_RF64 | SF_FORMAT_PCM_32, SF_FORMAT_FLAC | SF_FORMAT_PCM_16, SF_FORMAT_FLAC | SF_FORMAT_PCM_24}) {
    Sound sound = sine(0.7, 997, 0.11, 2, 44100);
    sound.format = format;
    write_sound(folder / "take", sound);
    const Sound plain = read_sound(folder / "take");
    for (const int block : {1, 480, 100000}) {
      CAPTURE(format, block);
      SoundFileTake take(folder / "take");
      CHECK(take.format().rate_hz == 44100);
      CHECK(take.format().channels == 2);
      CHECK(take.format().frames == 4851);
      CHECK(take.warning().empty());
      CHECK(read_all(take, block) == plain.samples);
    }
  }
}

TEST_CASE("Channels from 1 to 8 and rates from 8 to 384 kHz are accepted, others refused with the range") {
  const TemporaryFolder folder;
  const auto refusal_of = [&](int channels, int rate_hz) {
    write_sound(folder / "take.wav", sine(0.5, 100, 0.01, channels, rate_hz));
    return refusal(folder / "take.wav");
  };
  CHECK(refusal_of(8, 48000).empty());
  CHECK(refusal_of(1, 8000).empty());
  CHECK(refusal_of(1, 384000).empty());
  CHECK_THAT(refusal_of(9, 48000), ContainsSubstring("9 channels") && ContainsSubstring("1 to 8"));
  CHECK_THAT(refusal_of(1, 7999), ContainsSubstring("7999 Hz") && ContainsSubstring("8000 to 384000"));
  CHECK_THAT(refusal_of(1, 384001), ContainsSubstring("384001 Hz"));
}

TEST_CASE("What is not a file of these kinds is refused with its name and the reason") {
  const TemporaryFolder folder;
  CHECK_THAT(refusal(folder / "no such.wav"),
             ContainsSubstring("no such.wav") && ContainsSubstring("No such file or directory"));
  CHECK_THAT(refusal(folder.path()), ContainsSubstring("is a folder"));
  write_text(folder / "text.wav", "title = \"not a sound\"\n");
  CHECK_THAT(refusal(folder / "text.wav"), ContainsSubstring("not a sound file") && ContainsSubstring("WAV, FLAC"));
  write_text(folder / "nothing.wav", "");
  CHECK_THAT(refusal(folder / "nothing.wav"), ContainsSubstring("not a sound file"));
  write_text(folder / "file", "");
  CHECK_THAT(refusal(folder / "file/take.wav"), ContainsSubstring("Not a directory"));
  REQUIRE(::mkfifo((folder / "pipe").c_str(), 0600) == 0);
  CHECK_THAT(refusal(folder / "pipe"), ContainsSubstring("not a regular file"));

  Sound sound = sine(0.5, 440, 0.1);
  sound.format = SF_FORMAT_AU | SF_FORMAT_PCM_16;
  write_sound(folder / "take.au", sound);
  CHECK_THAT(refusal(folder / "take.au"), ContainsSubstring("\"AU") && ContainsSubstring("convert"));
  sound.format = SF_FORMAT_AIFF | SF_FORMAT_IMA_ADPCM;
  write_sound(folder / "packed.aiff", sound);
  CHECK_THAT(refusal(folder / "packed.aiff"), ContainsSubstring("AIFF") && ContainsSubstring("unusual"));
  sound.format = SF_FORMAT_OGG | SF_FORMAT_VORBIS;
  write_sound(folder / "take.wav", sound);  // the name does not decide
  CHECK_THAT(refusal(folder / "take.wav"), ContainsSubstring("OGG"));
  sound.format = SF_FORMAT_WAV | SF_FORMAT_MS_ADPCM;
  write_sound(folder / "packed.wav", sound);
  CHECK_THAT(refusal(folder / "packed.wav"), ContainsSubstring("unusual"));
}

TEST_CASE("An empty take is refused") {
  const TemporaryFolder folder;
  for (const int format : {SF_FORMAT_WAV | SF_FORMAT_PCM_16, SF_FORMAT_FLAC | SF_FORMAT_PCM_16}) {
    CAPTURE(format);
    write_sound(folder / "empty", {48000, 2, format, {}});
    const std::string text = refusal(folder / "empty");
    CHECK_THAT(text, ContainsSubstring("holds no sound") || ContainsSubstring("not a sound file"));
  }
}

TEST_CASE("A FLAC take that is cut short is refused with how far it can be read") {
  const TemporaryFolder folder;
  Sound sound = sine(0.5, 440, 2);
  sound.format = SF_FORMAT_FLAC | SF_FORMAT_PCM_16;
  write_sound(folder / "take.flac", sound);
  const std::string whole = read_text(folder / "take.flac");
  for (const double share : {0.3, 0.6, 0.99}) {
    CAPTURE(share);
    write_text(folder / "cut.flac",
               whole.substr(0, static_cast<std::size_t>(share * static_cast<double>(whole.size()))));
    CHECK_THAT(refusal(folder / "cut.flac"), ContainsSubstring("cut short") && ContainsSubstring("of 96000"));
  }
}

TEST_CASE("A FLAC take that does not say how long it is is read to its end") {
  const TemporaryFolder folder;
  Sound sound = sine(0.5, 440, 0.5);
  sound.format = SF_FORMAT_FLAC | SF_FORMAT_PCM_16;
  write_sound(folder / "take.flac", sound);
  std::string bytes = read_text(folder / "take.flac");
  // STREAMINFO is the first block: the 36 bits of the sample count end at byte 26 (FLAC format, RFC 9639 section 8.2).
  bytes[21] = static_cast<char>(bytes[21] & 0xf0);
  for (std::size_t i = 22; i < 26; ++i) bytes[i] = 0;
  write_text(folder / "open.flac", bytes);
  SoundFileTake take(folder / "open.flac");
  CHECK(take.format().frames == 0);
  CHECK(read_all(take, 1000).size() == 24000);
}

TEST_CASE("A take that is cut short is used as far as it goes, with a warning") {
  const TemporaryFolder folder;
  for (const int container : {SF_FORMAT_WAV, SF_FORMAT_RF64, SF_FORMAT_W64, SF_FORMAT_AIFF}) {
    CAPTURE(container);
    Sound sound = sine(0.5, 440, 1);
    sound.format = container | SF_FORMAT_PCM_24;
    write_sound(folder / "take.wav", sound);
    const std::string whole = read_text(folder / "take.wav");
    write_text(folder / "cut.wav", whole.substr(0, whole.size() - 30000));
    SoundFileTake take(folder / "cut.wav");
    CHECK_THAT(take.warning(), ContainsSubstring("cut short") && ContainsSubstring("30000 bytes"));
    CHECK(read_all(take, 1000).size() == 38000);
    CHECK(SoundFileTake(folder / "take.wav").warning().empty());
  }
  // A header without a length, as a program writes it that streams.
  write_sound(folder / "take.wav", sine(0.5, 440, 1));
  std::string bytes = read_text(folder / "take.wav");
  const std::size_t data = bytes.find("data");
  for (std::size_t i = 4; i < 8; ++i) bytes[i] = bytes[data + i] = '\xff';
  write_text(folder / "streamed.wav", bytes);
  SoundFileTake take(folder / "streamed.wav");
  CHECK(take.warning().empty());
  CHECK(read_all(take, 1000).size() == 48000);
}

TEST_CASE("Samples that no recording holds are refused with their place") {
  const TemporaryFolder folder;
  constexpr double kInfinity = std::numeric_limits<double>::infinity();
  for (const double bad : {std::nan(""), kInfinity, -kInfinity, 1.1e6, -1e30}) {
    CAPTURE(bad);
    Sound sound = sine(0.5, 440, 1, 2);
    sound.format = SF_FORMAT_WAV | SF_FORMAT_FLOAT;
    sound.samples[2 * 36000 + 1] = bad;
    write_sound(folder / "take.wav", sound);
    CHECK_THAT(refusal(folder / "take.wav"), ContainsSubstring("sample 36000 (at 0.75 s) of channel 2"));
  }
  Sound hot = sine(1e6, 440, 0.1);
  hot.format = SF_FORMAT_WAV | SF_FORMAT_DOUBLE;
  write_sound(folder / "hot.wav", hot);
  CHECK(refusal(folder / "hot.wav").empty());
}

TEST_CASE("Integer samples are rounded to the nearest step and clipped, never wrapped") {
  const TemporaryFolder folder;
  constexpr double kStep = 0x1p-23;
  const std::vector<double> in = {0,   0.4 * kStep, 0.6 * kStep, -0.6 * kStep, 1.5 * kStep, 2.5 * kStep,
                                  0.5, 1.0,         1.5,         -1.0,         -1.5,        1e6};
  const std::vector<double> out = {0,   0,         kStep,     -kStep, 2 * kStep, 2 * kStep,
                                   0.5, 1 - kStep, 1 - kStep, -1,     -1,        1 - kStep};
  CHECK(written(folder / "24.wav", Depth::pcm24, in) == out);
  CHECK(written(folder / "gain.wav", Depth::pcm24, {0.5, 1.0}, 0.25) == std::vector<double>{0.125, 0.25});
  const auto clipped = written(folder / "16.wav", Depth::pcm16, {1.5, -1.5, 3.0, -3.0});
  CHECK(clipped == std::vector<double>{1 - 0x1p-15, -1, 1 - 0x1p-15, -1});
}

TEST_CASE("Float samples are kept as they are, above full scale too") {
  const TemporaryFolder folder;
  CHECK(written(folder / "clip.wav", Depth::float32, {0.1, -1.75, 1e-30}) ==
        std::vector<double>{static_cast<double>(0.1f), -1.75, static_cast<double>(1e-30f)});
}

TEST_CASE("16-bit dither makes the error independent of the signal: mean 0, variance 1/4 of a squared step") {
  // Lipshitz, Wannamaker and Vanderkooy (1992): triangular dither 2 steps wide, variance 1/6 + 1/12. 5 sigma of 200000.
  const TemporaryFolder folder;
  for (const double level : {0.0001, 0.25, 0.5, 1000.3}) {  // in steps
    CAPTURE(level);
    const auto path = folder / ("clip-" + std::to_string(level) + ".wav");
    const auto out = written(path, Depth::pcm16, std::vector<double>(200000, level * 0x1p-15));
    double sum = 0;
    double squares = 0;
    for (const double sample : out) {
      const double error = sample * 0x1p15 - level;
      sum += error;
      squares += error * error;
    }
    CHECK_THAT(sum / 200000, WithinAbs(0, 5 * 0.5 / std::sqrt(200000.0)));
    CHECK_THAT(squares / 200000, WithinAbs(0.25, 0.005));
  }
}

TEST_CASE("Dither is the same for the same clip, another for another, and leaves digital silence alone") {
  const TemporaryFolder folder;
  const std::vector<double> quiet(1000, 1e-5);
  const auto first = written(folder / "1.wav", Depth::pcm16, quiet);
  CHECK(written(folder / "2.wav", Depth::pcm16, quiet) == first);
  CHECK(written(folder / "3.wav", Depth::pcm16, quiet, 1, "other.wav") != first);
  CHECK(written(folder / "4.wav", Depth::pcm16, std::vector<double>(1000, 0.0)) == std::vector<double>(1000, 0.0));
  const bool same = read_text(folder / "1.wav") == read_text(folder / "2.wav");
  CHECK(same);
}

TEST_CASE("Several channels are written side by side and their peak is that of the file") {
  const TemporaryFolder folder;
  const std::vector<double> left = {0.1, 0.2, -0.3};
  const std::vector<double> middle = {0, -0.75, 0};
  const std::vector<double> right = {0.5, 0, 0.25};
  const double* channels[] = {left.data(), middle.data(), right.data()};
  for (const Depth depth : {Depth::pcm16, Depth::pcm24, Depth::float32}) {
    const auto path = folder / ("clip-" + std::to_string(static_cast<int>(depth)) + ".wav");
    ClipWriter writer(path, "clip.wav", {96000, 3, 3}, {FileKind::wav, depth});
    writer.write(channels, 3, 1);
    writer.close();
    const Sound sound = read_sound(path);
    CHECK(sound.rate_hz == 96000);
    REQUIRE(sound.samples.size() == 9);
    double peak = 0;
    for (std::size_t i = 0; i < 9; ++i) {
      CHECK_THAT(sound.samples[i], WithinAbs(channels[i % 3][i / 3], 2.1 * 0x1p-15));
      peak = std::max(peak, std::abs(sound.samples[i]));
    }
    CHECK(writer.peak() == peak);
  }
}

TEST_CASE("A clip of unknown length ends as plain RIFF when it is short") {
  const TemporaryFolder folder;
  ClipWriter writer(folder / "clip.wav", "clip.wav", {48000, 1, 0}, ClipFormat{});
  const std::vector<double> samples(5000, 0.25);
  const double* channel = samples.data();
  writer.write(&channel, 5000, 1);
  writer.close();
  CHECK(read_text(folder / "clip.wav").substr(0, 4) == "RIFF");
  CHECK(read_sound(folder / "clip.wav").samples == samples);
}

TEST_CASE("A clip that may pass 4 GiB has room for long sizes in its header, a short one has not") {
  // EBU Tech 3306: a JUNK chunk where ds64 goes, should the file need it. The writer turns one into the other.
  const TemporaryFolder folder;
  const std::vector<double> samples(10, 0.25);
  const double* channel = samples.data();
  const auto header_of = [&](const std::string& name, std::int64_t frames) {
    ClipWriter writer(folder / name, "clip.wav", {48000, 1, frames}, ClipFormat{});
    writer.write(&channel, 10, 1);
    writer.close();
    return read_text(folder / name);
  };
  CHECK_THAT(header_of("long.wav", 1'440'000'000), ContainsSubstring("JUNK"));
  CHECK_THAT(header_of("short.wav", 1'400'000'000), !ContainsSubstring("JUNK"));
}

TEST_CASE("Samples that are not finite are never written") {
  const TemporaryFolder folder;
  int number = 0;
  for (const Depth depth : {Depth::pcm16, Depth::pcm24, Depth::float32}) {
    for (const double bad : {std::nan(""), std::numeric_limits<double>::infinity(), 1e300}) {
      if (bad == 1e300 && depth != Depth::float32) continue;  // clipped there, too large for a float here
      CAPTURE(number, bad);
      ClipWriter writer(folder / std::to_string(++number), "clip.wav", {48000, 2, 100}, {FileKind::wav, depth});
      std::vector<double> left(100, 0.1);
      std::vector<double> right(100, 0.1);
      const double* channels[] = {left.data(), right.data()};
      writer.write(channels, 100, 1);
      right[42] = bad;
      CHECK_THAT(message_of<CannotError>([&] { writer.write(channels, 100, 1); }),
                 ContainsSubstring("clip.wav") && ContainsSubstring("sample 142 of channel 2"));
    }
  }
}

TEST_CASE("A clip is not written over a file, nor where the system says no") {
  const TemporaryFolder folder;
  write_text(folder / "mine.wav", "mine");
  const auto refusal_at = [&](const std::filesystem::path& path) {
    return message_of<CannotError>([&] { ClipWriter(path, "clip.wav", {48000, 1, 1}, ClipFormat{}); });
  };
  CHECK_THAT(refusal_at(folder / "mine.wav"), ContainsSubstring("File exists"));
  CHECK(read_text(folder / "mine.wav") == "mine");
  CHECK_THAT(refusal_at(folder / "no/clip.wav"), ContainsSubstring("No such file or directory"));
}

TEST_CASE("A disk that takes no more ends a clip with the system's reason") {
  const TemporaryFolder folder;
  rlimit before{};
  REQUIRE(::getrlimit(RLIMIT_FSIZE, &before) == 0);
  const auto handler = std::signal(SIGXFSZ, SIG_IGN);
  rlimit small = before;
  small.rlim_cur = 100000;  // stands for a full disk: write() fails part of the way
  REQUIRE(::setrlimit(RLIMIT_FSIZE, &small) == 0);
  const std::string text =
      message_of<CannotError>([&] { written(folder / "c.wav", Depth::pcm24, std::vector<double>(50000, 0.5)); });
  ::setrlimit(RLIMIT_FSIZE, &before);
  std::signal(SIGXFSZ, handler);
  CHECK_THAT(text, ContainsSubstring("clip.wav") && ContainsSubstring("File too large"));
}

TEST_CASE("Files that promise more sound than there is in the world are read without believing it") {
  const TemporaryFolder folder;
  const std::vector<std::pair<int, std::string>> cases = {
      {SF_FORMAT_WAV, std::string("\xff\xff\xff\x7f", 4)},
      {SF_FORMAT_AIFF, std::string("\x7f\xff\xff\xf0", 4)},
      {SF_FORMAT_W64, std::string("\xff\xff\xff\xff\xff\xff\xff\x7f", 8)},
  };
  for (const auto& [container, size] : cases) {
    CAPTURE(container);
    Sound sound = sine(0.5, 440, 1);
    sound.format = container | SF_FORMAT_PCM_24;
    write_sound(folder / "take", sound);
    std::string bytes = read_text(folder / "take");
    const std::size_t name = container == SF_FORMAT_AIFF ? bytes.find("SSND") : bytes.find("data");
    REQUIRE(name != std::string::npos);
    bytes.replace(name + (container == SF_FORMAT_W64 ? 16 : 4), size.size(), size);
    write_text(folder / "take", bytes);
    SoundFileTake take(folder / "take");
    CHECK_THAT(take.warning(), ContainsSubstring("cut short"));
    CHECK(take.format().frames <= 48000);
    CHECK(read_all(take, 1000).size() == 48000);
  }
}
