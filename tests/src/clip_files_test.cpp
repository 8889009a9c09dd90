// Clips in every file format: what comes back, what is written about them, and how their levels are set.
#include <sndfile.h>

#include <algorithm>
#include <cmath>
#include <random>

#include "dsp/error.h"
#include "src/loudness.h"
#include "src/render.h"
#include "tests/catch.h"
#include "tests/src/sound_fixture.h"

using Catch::Matchers::ContainsSubstring;
using Catch::Matchers::WithinAbs;
using namespace unsoldered::test;
using unsoldered::ClipRow;
using unsoldered::Depth;
using unsoldered::FileKind;
using unsoldered::InputError;
using unsoldered::RenderRequest;
using unsoldered::RenderResult;

namespace {

namespace fs = std::filesystem;

constexpr double kCeiling = 0.891250938133746;  // -1 dB

RenderRequest request_for(const fs::path& take, const fs::path& out, FileKind kind, Depth depth = Depth::pcm24) {
  RenderRequest request;
  request.take = take.string();
  request.hookups = {{"plain.hookup.toml", plain_line_hookup()}};
  request.dials = {10};
  request.folder = out;
  request.format = {kind, depth};
  return request;
}

RenderResult render(const RenderRequest& request) {
  unsoldered::Progress progress("rendering", stderr);
  return unsoldered::render(request, progress);
}

/// Decaying partials and a little noise, peak near `level`: something an encoder is made for.
Sound music(double level, double seconds, int channels, int rate_hz) {
  Sound sound;
  sound.rate_hz = rate_hz;
  sound.channels = channels;
  sound.format = SF_FORMAT_WAV | SF_FORMAT_FLOAT;
  std::mt19937 random(1);
  std::uniform_real_distribution<double> noise(-0.002, 0.002);
  const auto frames = static_cast<std::size_t>(seconds * rate_hz);
  for (std::size_t i = 0; i < frames; ++i) {
    const double t = static_cast<double>(i) / rate_hz;
    const double since = std::fmod(t, 0.5);
    for (int channel = 0; channel < channels; ++channel) {
      double sample = 0;
      for (int partial = 1; partial <= 12; ++partial) {
        const double hz = partial * (110.0 + 30 * channel + 40 * std::floor(t / 0.5));
        if (hz > 0.4 * rate_hz) break;
        sample += std::exp(-since * (2 + partial)) * std::sin(2 * std::numbers::pi * hz * t) / partial;
      }
      sound.samples.push_back(level * (0.6 * sample + noise(random)));
    }
  }
  return sound;
}

double rms(const std::vector<double>& samples) {
  double sum = 0;
  for (const double sample : samples) sum += sample * sample;
  return std::sqrt(sum / static_cast<double>(samples.size()));
}

/// Error of `got` against `wanted`, in dB below the signal.
double error_db(const Sound& wanted, const Sound& got) {
  std::vector<double> error = got.samples;
  for (std::size_t i = 0; i < error.size(); ++i) error[i] -= wanted.samples[i];
  return 20 * std::log10(rms(error) / rms(wanted.samples));
}

/// How much later `got` is, in samples: the delay that leaves the least error, to first order.
double delay_samples(const Sound& wanted, const Sound& got) {
  const auto step = static_cast<std::size_t>(wanted.channels);
  double along = 0;
  double squares = 0;
  for (std::size_t i = step; i + step < wanted.samples.size(); ++i) {
    const double slope = (wanted.samples[i + step] - wanted.samples[i - step]) / 2;
    along -= (got.samples[i] - wanted.samples[i]) * slope;
    squares += slope * slope;
  }
  return along / squares;
}

std::string string_of(const fs::path& path, int what) {
  SF_INFO info{};
  SNDFILE* file = sf_open(path.c_str(), SFM_READ, &info);
  REQUIRE(file != nullptr);
  const char* text = sf_get_string(file, what);
  const std::string found = text == nullptr ? "" : text;
  sf_close(file);
  return found;
}

unsoldered::Loudness measured(const Sound& sound) {
  unsoldered::LoudnessMeter meter(sound.rate_hz, sound.channels);
  std::vector<std::vector<double>> planar(static_cast<std::size_t>(sound.channels));
  for (std::size_t i = 0; i < sound.samples.size(); ++i) planar[i % planar.size()].push_back(sound.samples[i]);
  std::vector<const double*> pointers;
  for (const auto& channel : planar) pointers.push_back(channel.data());
  meter.add(pointers.data(), static_cast<int>(sound.frames()));
  return meter.finish();
}

}  // namespace

TEST_CASE("Every format gives back what was rendered, in line with it and as long") {
  const TemporaryFolder folder;
  struct Case {
    FileKind kind;
    Depth depth;
    int rate_hz, channels;
    double error_db;  // at most
  };
  int number = 0;
  for (const Case& clip :
       {Case{FileKind::wav, Depth::pcm16, 44100, 2, -60}, Case{FileKind::wav, Depth::pcm24, 96000, 3, -120},
        Case{FileKind::flac, Depth::pcm16, 48000, 1, -60}, Case{FileKind::flac, Depth::pcm24, 192000, 2, -120},
        Case{FileKind::flac, Depth::pcm24, 48000, 8, -120}, Case{FileKind::mp3, Depth::pcm24, 44100, 2, -30},
        Case{FileKind::mp3, Depth::pcm24, 48000, 1, -30}, Case{FileKind::mp3, Depth::pcm24, 22050, 2, -25},
        Case{FileKind::ogg, Depth::pcm24, 44100, 2, -30}, Case{FileKind::ogg, Depth::pcm24, 48000, 1, -30},
        Case{FileKind::ogg, Depth::pcm24, 96000, 2, -30}}) {
    CAPTURE(static_cast<int>(clip.kind), static_cast<int>(clip.depth), clip.rate_hz, clip.channels);
    write_sound(folder / "take.wav", music(0.5, 1.7, clip.channels, clip.rate_hz));
    const auto out = folder / std::to_string(++number);
    const RenderResult reference =
        render(request_for(folder / "take.wav", out / "float", FileKind::wav, Depth::float32));
    const RenderResult result = render(request_for(folder / "take.wav", out / "clip", clip.kind, clip.depth));
    const std::string file = result.clips.at(0).file;
    CHECK(fs::path(file).extension() == unsoldered::file_ending(clip.kind));
    const Sound wanted = read_sound(out / "float" / reference.clips.at(0).file);
    const Sound got = read_sound(out / "clip" / file);
    CHECK(got.rate_hz == clip.rate_hz);
    CHECK(got.channels == clip.channels);
    REQUIRE(got.samples.size() == wanted.samples.size());
    CHECK(error_db(wanted, got) < clip.error_db);
    CHECK_THAT(delay_samples(wanted, got), WithinAbs(0, 0.05));
  }
}

TEST_CASE("The measure of delay sees a sample") {
  const Sound sound = music(0.5, 1, 2, 48000);
  Sound late = sound;
  late.samples.insert(late.samples.begin(), 2, 0.0);
  late.samples.resize(sound.samples.size());
  CHECK_THAT(delay_samples(sound, late), WithinAbs(1, 0.1));
}

TEST_CASE("Clips shorter than an encoder's block come back whole") {
  const TemporaryFolder folder;
  for (const FileKind kind : {FileKind::flac, FileKind::mp3, FileKind::ogg}) {
    for (const int frames : {1, 30, 700, 1153}) {
      CAPTURE(static_cast<int>(kind), frames);
      Sound take = sine(0.5, 440, 1);
      take.samples.resize(static_cast<std::size_t>(frames));
      write_sound(folder / "take.wav", take);
      RenderRequest request = request_for(folder / "take.wav", folder / "clips", kind);
      request.force = true;
      const RenderResult result = render(request);
      CHECK(read_sound(folder / "clips" / result.clips.at(0).file).frames() == static_cast<std::size_t>(frames));
    }
  }
}

TEST_CASE("A FLAC clip holds the very samples of the WAV clip of its depth") {
  const TemporaryFolder folder;
  write_sound(folder / "take.wav", music(3, 1, 2, 44100));  // loud: the common gain too
  for (const Depth depth : {Depth::pcm16, Depth::pcm24}) {
    RenderRequest request = request_for(folder / "take.wav", folder / "wav", FileKind::wav, depth);
    request.force = true;
    const RenderResult wav = render(request);
    request.format.kind = FileKind::flac;
    const RenderResult flac = render(request);
    CHECK(wav.clips.at(0).gain_db < -1);
    CHECK(flac.clips.at(0).gain_db == wav.clips.at(0).gain_db);
    const Sound one = read_sound(folder / "wav" / wav.clips.at(0).file);
    const Sound other = read_sound(folder / "wav" / flac.clips.at(0).file);
    if (depth == Depth::pcm24) {
      CHECK(one.samples == other.samples);
    } else {  // each file's name seeds its own dither
      CHECK(error_db(one, other) < -60);
    }
  }
}

TEST_CASE("Files name take, hookup, dial, gain and program where their format has a place for it") {
  const TemporaryFolder folder;
  write_sound(folder / "riff.wav", music(3, 1, 1, 44100));
  for (const FileKind kind : {FileKind::wav, FileKind::flac, FileKind::mp3, FileKind::ogg}) {
    CAPTURE(static_cast<int>(kind));
    RenderRequest request = request_for(folder / "riff.wav", folder / "clips", kind);
    request.hookups[0].hookup.title = "Brücke, 500k";
    request.dials = {7.5};
    const RenderResult result = render(request);
    const ClipRow& row = result.clips.at(0);
    const fs::path file = folder / "clips" / row.file;
    CHECK(string_of(file, SF_STR_TITLE) == "riff, Brücke, 500k");
    const std::string gain = row.gain_db == 0 ? "0" : "-";
    CHECK_THAT(string_of(file, SF_STR_COMMENT), ContainsSubstring("hookup plain, dial 7.5, gain " + gain));
    if (kind != FileKind::mp3) CHECK_THAT(string_of(file, SF_STR_SOFTWARE), ContainsSubstring("Unsoldered"));
    fs::remove_all(folder / "clips");
    CHECK_THAT(row.gain_db, WithinAbs(-5.9, 3));
  }
}

TEST_CASE("The gain in the comment is the gain in the list, and a turning knob is named") {
  const TemporaryFolder folder;
  write_sound(folder / "riff.wav", sine(2, 440, 0.5));
  Sound hot = sine(2, 440, 0.5);
  hot.format = SF_FORMAT_WAV | SF_FORMAT_FLOAT;
  write_sound(folder / "riff.wav", hot);
  RenderRequest request = request_for(folder / "riff.wav", folder / "clips", FileKind::wav);
  request.turns = {unsoldered::parse_knob_turn("0:0,0.4:10", "--turn")};
  const RenderResult result = render(request);
  const double gain = std::round(100 * result.clips.at(0).gain_db) / 100;
  char text[80];
  std::snprintf(text, sizeof text, "hookup plain, volume knob turning, gain %g dB", gain);
  CHECK(gain < -5);
  CHECK(string_of(folder / "clips" / result.clips.at(0).file, SF_STR_COMMENT) == text);
}

TEST_CASE("Lossy clips are lowered together until the loudest is at -1 dBTP before encoding") {
  const TemporaryFolder folder;
  // A sine at a quarter of the rate whose samples miss its crests by 3 dB: sample peak 0.98, true peak 1.39 of full scale.
  Sound take = music(0.1, 4, 1, 48000);
  for (std::size_t i = 0; i < take.samples.size(); ++i) {
    take.samples[i] = 1.4 * std::sin(2 * std::numbers::pi * (static_cast<double>(i) / 4 + 0.125));
  }
  write_sound(folder / "take.wav", take);
  for (const FileKind kind : {FileKind::mp3, FileKind::ogg}) {
    CAPTURE(static_cast<int>(kind));
    RenderRequest request = request_for(folder / "take.wav", folder / "clips", kind);
    request.dials = {5, 10};
    request.force = true;
    const RenderResult result = render(request);
    CHECK(result.clips.at(0).gain_db == result.clips.at(1).gain_db);
    REQUIRE(result.clips.at(1).peak_dbtp.has_value());
    CHECK_THAT(*result.clips.at(1).peak_dbtp, WithinAbs(-1, 1e-6));
    CHECK(result.clips.at(1).peak_dbfs < -3);
    CHECK(result.clips.at(1).gain_db < -3.5);
    REQUIRE(result.clips.at(0).loudness_lufs.has_value());
    const Sound decoded = read_sound(folder / "clips" / result.clips.at(1).file);
    const auto again = measured(decoded);
    CHECK_THAT(20 * std::log10(again.true_peak()), WithinAbs(-1, 0.3));
  }
  // A tone at a quarter of the rate is no sound to judge an encoder's loudness by; this is.
  write_sound(folder / "take.wav", music(0.5, 4, 2, 48000));
  for (const FileKind kind : {FileKind::mp3, FileKind::ogg}) {
    RenderRequest request = request_for(folder / "take.wav", folder / "clips", kind);
    request.force = true;
    const ClipRow row = render(request).clips.at(0);
    const auto again = measured(read_sound(folder / "clips" / row.file));
    CHECK_THAT(again.integrated_lufs(), WithinAbs(row.loudness_lufs.value(), 0.1));
    CHECK_THAT(20 * std::log10(again.true_peak()), WithinAbs(row.peak_dbtp.value(), 0.3));
  }
  // A sample peak of -3 dBFS needs no lowering in whole numbers.
  const Sound low = sine(0.7, 440, 0.5);
  write_sound(folder / "take.wav", low);
  CHECK(render(request_for(folder / "take.wav", folder / "wav", FileKind::wav)).clips.at(0).gain_db == 0);
}

TEST_CASE("A lossy clip whose peaks grow past full scale in the encoder is named") {
  const TemporaryFolder folder;
  Sound take = sine(0.5, 440, 4);  // full-scale noise of two values: what the encoder takes away had kept its peaks low
  std::mt19937 random(1);
  for (double& sample : take.samples) sample = (random() & 1u) != 0 ? 0.9 : -0.9;
  write_sound(folder / "take.wav", take);
  const RenderResult result = render(request_for(folder / "take.wav", folder / "clips", FileKind::mp3));
  const std::string& file = result.clips.at(0).file;
  CHECK(measured(read_sound(folder / "clips" / file)).true_peak() > 1);
  REQUIRE(result.messages.size() == 2);
  CHECK_THAT(result.messages[1],
             ContainsSubstring(file) && ContainsSubstring("over full scale") && ContainsSubstring("flac or wav"));
}

TEST_CASE("Loudness and true peak are in the list when asked for, of the clip as it was written") {
  const TemporaryFolder folder;
  write_sound(folder / "take.wav", music(3, 4, 2, 48000));
  RenderRequest request = request_for(folder / "take.wav", folder / "clips", FileKind::wav);
  request.dials = {10, 5};
  RenderResult result = render(request);
  CHECK_FALSE(result.clips.at(0).peak_dbtp.has_value());
  CHECK_FALSE(result.clips.at(0).loudness_lufs.has_value());
  request.measure = true;
  request.force = true;
  for (const Depth depth : {Depth::pcm24, Depth::pcm16, Depth::float32}) {
    request.format.depth = depth;
    result = render(request);
    CHECK((result.clips.at(0).gain_db < -1) == (depth != Depth::float32));
    for (const ClipRow& row : result.clips) {
      const auto again = measured(read_sound(folder / "clips" / row.file));
      CHECK_THAT(row.loudness_lufs.value(), WithinAbs(again.integrated_lufs(), 0.001));
      CHECK_THAT(row.peak_dbtp.value(), WithinAbs(20 * std::log10(again.true_peak()), 0.002));
      CHECK(row.peak_dbtp.value() >= row.peak_dbfs - 0.002);
    }
  }
}

TEST_CASE("Matched hookups have one loudness at each dial position, as high as -1 dBTP allows, at every depth") {
  const TemporaryFolder folder;
  write_sound(folder / "take.wav", music(0.2, 5, 1, 48000));
  RenderRequest request = request_for(folder / "take.wav", folder / "clips", FileKind::wav);
  auto dull = plain_line_hookup();
  dull.volume.pot.total_ohm = 250e3;
  dull.source.resistance_ohm = 20e3;
  dull.load.capacitance_f = 2e-9;
  request.hookups.push_back({"dull.hookup.toml", dull});
  request.dials = {10, 4, 0};
  request.match_loudness = true;
  request.force = true;
  for (const Depth depth : {Depth::pcm24, Depth::pcm16, Depth::float32}) {
    CAPTURE(static_cast<int>(depth));
    request.format.depth = depth;
    const RenderResult result = render(request);
    for (const std::size_t dial : {0u, 1u}) {
      const auto one = measured(read_sound(folder / "clips" / result.clips.at(dial).file));
      const auto other = measured(read_sound(folder / "clips" / result.clips.at(3 + dial).file));
      CHECK_THAT(one.integrated_lufs(), WithinAbs(other.integrated_lufs(), 0.01));
      const double peak = std::max(one.true_peak(), other.true_peak());
      CHECK_THAT(peak, WithinAbs(kCeiling, 3e-4));
      CHECK(result.clips.at(dial).gain_db != result.clips.at(3 + dial).gain_db);
    }
    // At 0 nothing is left to match: both keep their level, and both are named.
    CHECK(result.clips.at(2).gain_db == 0);
    CHECK(result.clips.at(5).gain_db == 0);
    REQUIRE(result.messages.size() == 2);
    CHECK_THAT(result.messages[0], ContainsSubstring("plain_dial-00.00") && ContainsSubstring("-70 LUFS"));
  }
}

TEST_CASE("What a format cannot hold is refused before anything is made") {
  const TemporaryFolder folder;
  write_sound(folder / "fast.wav", sine(0.5, 440, 0.1, 1, 96000));
  write_sound(folder / "wide.wav", sine(0.5, 440, 0.1, 3));
  for (const char* take : {"fast.wav", "wide.wav"}) {
    const RenderRequest request = request_for(folder / take, folder / "clips", FileKind::mp3);
    CHECK_THAT(message_of<InputError>([&] { render(request); }),
               ContainsSubstring("mp3") && ContainsSubstring("--format wav"));
    CHECK_FALSE(fs::exists(folder / "clips"));
  }
}
