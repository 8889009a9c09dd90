#include "src/render.h"

#include <fcntl.h>
#include <sys/stat.h>
#include <sys/wait.h>
#include <unistd.h>

#include <algorithm>
#include <chrono>
#include <cmath>
#include <csignal>
#include <set>
#include <thread>

#include "dsp/error.h"
#include "src/cancel.h"
#include "src/clip_name.h"
#include "src/number_text.h"
#include "src/tasks.h"
#include "tests/catch.h"
#include "tests/src/sound_fixture.h"

using Catch::Matchers::ContainsSubstring;
using Catch::Matchers::WithinAbs;
using namespace unsoldered::test;
using unsoldered::CannotError;
using unsoldered::ClipRow;
using unsoldered::Depth;
using unsoldered::InputError;
using unsoldered::RenderRequest;
using unsoldered::RenderResult;

namespace {

namespace fs = std::filesystem;

RenderRequest request_for(const fs::path& take, const fs::path& out) {
  RenderRequest request;
  request.take = take.string();
  request.hookups = {{"plain.hookup.toml", plain_line_hookup()}};
  request.dials = {10};
  request.folder = out;
  return request;
}

RenderResult render(const RenderRequest& request) {
  unsoldered::Progress progress("rendering", stderr);
  return unsoldered::render(request, progress);
}

std::set<std::string> names_in(const fs::path& folder) {
  std::set<std::string> names;
  for (const auto& entry : fs::directory_iterator(folder)) names.insert(entry.path().filename().string());
  return names;
}

std::string csv(const std::vector<ClipRow>& clips) { return unsoldered::csv_text(unsoldered::clip_table(clips)); }
std::string json(const std::vector<ClipRow>& clips) { return unsoldered::json_text(unsoldered::clip_table(clips)); }

double peak_db(const Sound& sound) {
  double peak = 0;
  for (const double sample : sound.samples) peak = std::max(peak, std::abs(sample));
  return 20 * std::log10(peak);
}

}  // namespace

TEST_CASE("Every hookup at every dial becomes a clip, and clips.csv lists them in that order") {
  const TemporaryFolder folder;
  write_sound(folder / "riff.wav", sine(0.5, 440, 0.2));
  RenderRequest request = request_for(folder / "riff.wav", folder / "clips");
  request.hookups.push_back({folder / "500k audio.toml", plain_line_hookup()});
  request.dials = {10, 7.5};
  const RenderResult result = render(request);
  const std::vector<std::string> files = {"riff_plain_dial-10.00.wav", "riff_plain_dial-07.50.wav",
                                          "riff_500k-audio_dial-10.00.wav", "riff_500k-audio_dial-07.50.wav"};
  REQUIRE(result.clips.size() == 4);
  std::set<std::string> expected(files.begin(), files.end());
  expected.insert("clips.csv");
  CHECK(names_in(folder / "clips") == expected);
  for (std::size_t i = 0; i < 4; ++i) {
    CHECK(result.clips[i].file == files[i]);
    CHECK(result.clips[i].hookup == (i < 2 ? "plain" : "500k audio"));
    CHECK(result.clips[i].dial == (i % 2 == 0 ? 10 : 7.5));
    CHECK(result.clips[i].gain_db == 0);
    CHECK_THAT(result.clips[i].peak_dbfs, WithinAbs(peak_db(read_sound(folder / "clips" / files[i])), 1e-9));
  }
  CHECK(read_text(folder / "clips/clips.csv") == csv(result.clips));
}

TEST_CASE("Clips line up with the take: its length, rate, channels and time") {
  const TemporaryFolder folder;
  struct Case {
    int channels, rate_hz, frames;
  };
  // Lengths below the latency, around the block size and over several blocks.
  for (const Case& take :
       {Case{1, 48000, 1}, Case{2, 44100, 20}, Case{1, 96000, 16384}, Case{3, 48000, 16385}, Case{8, 8000, 40000}}) {
    CAPTURE(take.channels, take.rate_hz, take.frames);
    Sound sound = sine(0.5, 500, 10, take.channels, take.rate_hz);
    sound.samples.resize(static_cast<std::size_t>(take.frames) * static_cast<std::size_t>(take.channels));
    write_sound(folder / "take.wav", sound);
    RenderRequest request = request_for(folder / "take.wav", folder / "clips");
    request.force = true;
    const Sound clip = read_sound(folder / "clips" / render(request).clips.at(0).file);
    CHECK(clip.rate_hz == take.rate_hz);
    CHECK(clip.channels == take.channels);
    REQUIRE(clip.samples.size() == sound.samples.size());
    // 0.99 of the emf; a sample of misalignment would be an error of 0.03 at 48 kHz. The ends ring where the sine is cut off.
    const std::size_t edge = 100 * static_cast<std::size_t>(take.channels);
    for (std::size_t i = edge; i + edge < clip.samples.size(); ++i) {
      if (std::abs(clip.samples[i] - sound.samples[i]) > 0.008) {
        CAPTURE(i, clip.samples[i], sound.samples[i]);
        FAIL("out of line");
      }
    }
  }
}

TEST_CASE("FLAC takes and the built-in take are rendered like WAV takes") {
  const TemporaryFolder folder;
  Sound sound = sine(0.5, 440, 0.3, 2);
  write_sound(folder / "take.wav", sound);
  sound.format = SF_FORMAT_FLAC | SF_FORMAT_PCM_24;
  write_sound(folder / "take.flac", sound);
  render(request_for(folder / "take.wav", folder / "a"));
  render(request_for(folder / "take.flac", folder / "b"));
  const Sound wav = read_sound(folder / "a/take_plain_dial-10.00.wav");
  const Sound flac = read_sound(folder / "b/take_plain_dial-10.00.wav");
  CHECK(flac.channels == 2);
  REQUIRE(flac.samples.size() == wav.samples.size());
  for (std::size_t i = 0; i < wav.samples.size(); ++i) {  // the two takes themselves differ by rounding
    if (std::abs(wav.samples[i] - flac.samples[i]) > 4 * 0x1p-23) FAIL("sample " << i);
  }
  const RenderResult result = render(request_for("built-in", folder / "c"));
  CHECK(result.clips.at(0).file == "built-in_plain_dial-10.00.wav");
  CHECK_THAT(result.clips.at(0).peak_dbfs, WithinAbs(-6.1, 0.2));
}

TEST_CASE("While the knob turns the level follows it at each time of the take") {
  const TemporaryFolder folder;
  const Sound take = sine(0.5, 1000, 2);
  write_sound(folder / "take.wav", take);
  RenderRequest request = request_for(folder / "take.wav", folder / "clips");
  request.turns = {unsoldered::parse_knob_turn("0.5:0,1.5:10", "--turn")};
  request.format.depth = Depth::float32;
  const RenderResult result = render(request);
  CHECK(result.clips.at(0).file == "take_plain_turn.wav");
  CHECK_FALSE(result.clips.at(0).dial.has_value());
  CHECK_THAT(read_text(folder / "clips/clips.csv"), ContainsSubstring("take_plain_turn.wav,plain,turn,0,"));
  const Sound clip = read_sound(folder / "clips/take_plain_turn.wav");
  REQUIRE(clip.samples.size() == take.samples.size());
  for (const double seconds : {0.25, 0.6, 0.75, 1.0, 1.25, 1.4, 1.75}) {
    // The linear pot's share is the dial's tenth, 3 % off at most through source and load.
    const double expected = std::clamp(seconds - 0.5, 0.0, 1.0);
    const auto at = static_cast<std::size_t>(seconds * 48000) + 12;  // a crest of the sine
    CAPTURE(seconds);
    CHECK_THAT(clip.samples[at] / take.samples[at], WithinAbs(expected, 0.03 * expected + 1e-5));
  }
}

TEST_CASE("A loud set is lowered by one common gain to -1 dBFS in integer formats, never in float") {
  const TemporaryFolder folder;
  Sound hot = sine(2.0, 440, 0.5);
  hot.format = SF_FORMAT_WAV | SF_FORMAT_FLOAT;
  write_sound(folder / "hot.wav", hot);
  RenderRequest request = request_for(folder / "hot.wav", folder / "24");
  request.dials = {5, 10, 1};
  const RenderResult result = render(request);
  const double gain_db = result.clips.at(0).gain_db;
  CHECK_THAT(gain_db, WithinAbs(-1 - 20 * std::log10(2.0), 0.12));
  for (const ClipRow& clip : result.clips) CHECK(clip.gain_db == gain_db);
  CHECK_THAT(peak_db(read_sound(folder / "24/hot_plain_dial-10.00.wav")), WithinAbs(-1, 1e-5));
  CHECK_THAT(result.clips.at(1).peak_dbfs, WithinAbs(-1, 1e-5));
  CHECK_THAT(result.clips.at(0).peak_dbfs, WithinAbs(-7, 0.3));
  CHECK(result.messages.size() == 1);

  request.folder = folder / "16";
  request.format.depth = Depth::pcm16;
  CHECK_THAT(render(request).clips.at(1).peak_dbfs, WithinAbs(-1, 0.001));

  request.folder = folder / "float";
  request.format.depth = Depth::float32;
  const RenderResult free = render(request);
  CHECK(free.clips.at(1).gain_db == 0);
  CHECK_THAT(free.clips.at(1).peak_dbfs, WithinAbs(20 * std::log10(2.0), 0.15));
  CHECK(free.messages.empty());

  // Lowered or not, the set is the same sound: 24 bits against float.
  const Sound lowered = read_sound(folder / "24/hot_plain_dial-05.00.wav");
  const Sound whole = read_sound(folder / "float/hot_plain_dial-05.00.wav");
  REQUIRE(lowered.samples.size() == whole.samples.size());
  for (std::size_t i = 0; i < whole.samples.size(); ++i) {
    const double expected = whole.samples[i] * std::pow(10, gain_db / 20);
    if (std::abs(lowered.samples[i] - expected) > 2e-7) FAIL("frame " << i << ": " << lowered.samples[i]);
  }
}

TEST_CASE("Silence has the level -inf and stays silence at every depth") {
  const TemporaryFolder folder;
  write_sound(folder / "silence.wav", {48000, 1, SF_FORMAT_WAV | SF_FORMAT_PCM_16, std::vector<double>(5000, 0.0)});
  RenderRequest request = request_for(folder / "silence.wav", folder / "clips");
  request.force = true;
  for (const Depth depth : {Depth::pcm16, Depth::pcm24, Depth::float32}) {
    request.format.depth = depth;
    const RenderResult result = render(request);
    CHECK_THAT(csv(result.clips), ContainsSubstring(",10,0,-inf,,\n"));
    CHECK_THAT(json(result.clips), ContainsSubstring("\"peak_dbfs\": null"));
  }
}

TEST_CASE("The clips are the same bytes whatever the number of threads", "[threads]") {
  const TemporaryFolder folder;
  Sound loud = sine(1.0, 440, 0.7, 2);
  loud.format = SF_FORMAT_FLAC | SF_FORMAT_PCM_16;
  write_sound(folder / "take.flac", loud);
  RenderRequest request = request_for(folder / "take.flac", folder / "1");
  request.dials = {10, 9, 8, 7, 6, 5, 4, 3, 2, 1, 0};
  request.format.depth = Depth::pcm16;
  render(request);
  for (const int jobs : {2, 7, 64}) {
    request.jobs = jobs;
    request.folder = folder / std::to_string(jobs);
    const RenderResult result = render(request);
    CHECK(result.clips.size() == 11);
    for (const std::string& name : names_in(folder / "1")) {
      CAPTURE(jobs, name);
      const bool same = read_text(folder / "1" / name) == read_text(request.folder / name);  // a file is no message
      CHECK(same);
    }
  }
}

TEST_CASE("Tasks all run, few at a time, and the first error stops the rest", "[threads]") {
  std::atomic<int> done{0};
  std::atomic<int> now{0};
  std::atomic<int> most{0};
  unsoldered::run_tasks(50, 3, [&](std::size_t, std::stop_token) {
    const int beside = ++now;
    for (int seen = most; beside > seen && !most.compare_exchange_weak(seen, beside);) {
    }
    std::this_thread::sleep_for(std::chrono::milliseconds(1));
    --now;
    ++done;
  });
  CHECK(done == 50);
  CHECK(most <= 3);

  done = 0;
  CHECK_THROWS_AS(unsoldered::run_tasks(1000, 4,
                                        [&](std::size_t index, std::stop_token stop) {
                                          if (index == 5) throw InputError("five");
                                          while (index > 5 && !stop.stop_requested()) std::this_thread::yield();
                                          ++done;
                                        }),
                  InputError);
  CHECK(done < 20);
}

TEST_CASE("Nothing is overwritten unasked") {
  const TemporaryFolder folder;
  write_sound(folder / "take.wav", sine(0.5, 440, 0.1));
  RenderRequest request = request_for(folder / "take.wav", folder / "clips");
  request.dials = {10, 5};
  fs::create_directory(folder / "clips");
  write_text(folder / "clips/take_plain_dial-05.00.wav", "mine");
  CHECK_THAT(message_of<InputError>([&] { render(request); }),
             ContainsSubstring("take_plain_dial-05.00.wav") && ContainsSubstring("--force"));
  CHECK(names_in(folder / "clips") == std::set<std::string>{"take_plain_dial-05.00.wav"});
  CHECK(read_text(folder / "clips/take_plain_dial-05.00.wav") == "mine");

  fs::remove(folder / "clips/take_plain_dial-05.00.wav");
  write_text(folder / "clips/clips.csv", "mine");
  CHECK_THAT(message_of<InputError>([&] { render(request); }), ContainsSubstring("clips.csv"));
  CHECK(names_in(folder / "clips") == std::set<std::string>{"clips.csv"});

  request.force = true;
  render(request);
  CHECK(names_in(folder / "clips").size() == 3);
  CHECK(read_text(folder / "clips/clips.csv") != "mine");
}

TEST_CASE("The take is never overwritten, not even by force or through another name") {
  const TemporaryFolder folder;
  write_sound(folder / "take.wav", sine(0.5, 440, 0.1));
  fs::create_directory(folder / "clips");
  fs::create_hard_link(folder / "take.wav", folder / "clips/take_plain_dial-10.00.wav");
  const std::string before = read_text(folder / "take.wav");
  RenderRequest request = request_for(folder / "take.wav", folder / "clips");
  request.force = true;
  CHECK_THAT(message_of<InputError>([&] { render(request); }), ContainsSubstring("the input"));
  const bool same = read_text(folder / "clips/take_plain_dial-10.00.wav") == before;
  CHECK(same);
  CHECK(names_in(folder / "clips").size() == 1);
}

TEST_CASE("Clips that would share a name are refused before anything is made") {
  const TemporaryFolder folder;
  write_sound(folder / "take.wav", sine(0.5, 440, 0.1));
  RenderRequest request = request_for(folder / "take.wav", folder / "clips");
  request.dials = {7, 7.001};
  CHECK_THAT(message_of<InputError>([&] { render(request); }), ContainsSubstring("take_plain_dial-07.00.wav"));
  request.dials = {7};
  request.hookups.push_back({"elsewhere/plain.hookup.toml", plain_line_hookup()});
  CHECK_THAT(message_of<InputError>([&] { render(request); }), ContainsSubstring("name of its own"));
  CHECK_FALSE(fs::exists(folder / "clips"));
}

TEST_CASE("A folder for the clips is made with its parents, and taken away when nothing came of it") {
  const TemporaryFolder folder;
  Sound sound = sine(0.5, 440, 3);
  sound.format = SF_FORMAT_WAV | SF_FORMAT_FLOAT;
  write_sound(folder / "take.wav", sound);
  sound.samples.back() = std::nan("");
  write_sound(folder / "bad.wav", sound);
  RenderRequest request = request_for(folder / "bad.wav", folder / "new/deep/clips/");
  request.dials = {10, 9, 8, 7};
  request.jobs = 2;
  CHECK_THAT(message_of<InputError>([&] { render(request); }),
             ContainsSubstring("bad.wav") && ContainsSubstring("nan"));
  CHECK_FALSE(fs::exists(folder / "new"));

  fs::create_directory(folder / "old");
  write_text(folder / "old/mine.txt", "mine");
  request.folder = folder / "old";
  CHECK_THROWS_AS(render(request), InputError);
  CHECK(names_in(folder / "old") == std::set<std::string>{"mine.txt"});

  request = request_for(folder / "take.wav", folder / "new/deep/clips/");
  render(request);
  CHECK(names_in(folder / "new/deep/clips").size() == 2);
  request.folder = folder / "take.wav";
  CHECK_THAT(message_of<InputError>([&] { render(request); }), ContainsSubstring("is a file"));
  request.folder = folder / "take.wav/clips";
  CHECK_THROWS(render(request));
  request.folder = "";
  CHECK_THAT(message_of<InputError>([&] { render(request); }), ContainsSubstring("--out"));
  request.folder = "/proc/no-such-folder";
  CHECK_THAT(message_of<CannotError>([&] { render(request); }), ContainsSubstring("/proc/no-such-folder"));
}

TEST_CASE("A knob the hookup does not have cannot turn") {
  const TemporaryFolder folder;
  write_sound(folder / "take.wav", sine(0.5, 440, 0.1));
  RenderRequest request = request_for(folder / "take.wav", folder / "clips");
  request.turns = {unsoldered::parse_knob_turn("tone=0:10,4:0", "--turn")};
  CHECK_THAT(message_of<InputError>([&] { render(request); }),
             ContainsSubstring("plain.hookup.toml") && ContainsSubstring("tone"));
  CHECK_FALSE(fs::exists(folder / "clips"));
}

TEST_CASE("A take that is cut short is rendered with a warning") {
  const TemporaryFolder folder;
  write_sound(folder / "take.wav", sine(0.5, 440, 1));
  fs::resize_file(folder / "take.wav", fs::file_size(folder / "take.wav") - 72000);
  const RenderResult result = render(request_for(folder / "take.wav", folder / "clips"));
  REQUIRE(result.messages.size() == 1);
  CHECK_THAT(result.messages[0], ContainsSubstring("cut short"));
  CHECK(read_sound(folder / "clips" / result.clips.at(0).file).frames() == 24000);
}

TEST_CASE("Ctrl-C stops the work and leaves nothing behind", "[threads]") {
  const TemporaryFolder folder;
  write_sound(folder / "take.wav", sine(0.5, 440, 60));
  RenderRequest request = request_for(folder / "take.wav", folder / "new/clips");
  for (int i = 0; i < 400; ++i) request.dials.push_back(i / 50.0);  // far more than can be done before the signal
  request.jobs = 2;
  const pid_t child = ::fork();
  REQUIRE(child >= 0);
  if (child == 0) {
    unsoldered::watch_for_interrupt();
    int status = 0;
    try {
      render(request);
    } catch (const unsoldered::Interrupted&) {
      status = 130;
    } catch (...) {
      status = 1;
    }
    ::_exit(status);
  }
  for (int i = 0; i < 2000 && (!fs::exists(folder / "new/clips") || fs::is_empty(folder / "new/clips")); ++i) {
    std::this_thread::sleep_for(std::chrono::milliseconds(5));
  }
  CHECK(fs::exists(folder / "new/clips"));
  ::kill(child, SIGINT);
  int status = 0;
  REQUIRE(::waitpid(child, &status, 0) == child);
  REQUIRE(WIFEXITED(status));
  CHECK(WEXITSTATUS(status) == 130);
  CHECK_FALSE(fs::exists(folder / "new"));
}

TEST_CASE("Names of clips keep what is safe everywhere and letters of all languages") {
  using unsoldered::safe_name;
  CHECK(safe_name("500k-audio_v1.2") == "500k-audio_v1.2");
  CHECK(safe_name("my riff/take:2*?") == "my-riff-take-2--");
  CHECK(safe_name("a,b\"c\nd") == "a-b-c-d");
  CHECK(safe_name("Brücke 音") == "Brücke-音");
  CHECK(safe_name("a\xff\xc3z") == "a--z");  // not UTF-8
  CHECK(safe_name("a\xc0\xaf"
                  "b") == "a--b");  // an overlong slash
  CHECK(safe_name("x\xe2\x80\xae"
                  "gpj") == "x-gpj");  // U+202E turns the reading direction
  CHECK(safe_name(".hidden") == "-hidden");
  CHECK(unsoldered::hookup_stem("a/b/500k.audio.hookup.toml") == "500k.audio");
  CHECK(unsoldered::hookup_stem("x.toml") == "x");
  CHECK(unsoldered::hookup_stem(".hookup.toml") == ".hookup");
  CHECK(unsoldered::clip_name("t", "h", 0.0) == "t_h_dial-00.00.wav");
  CHECK(unsoldered::clip_name("t", "h", 7.5) == "t_h_dial-07.50.wav");
  CHECK(unsoldered::clip_name("t", "h", 10.0) == "t_h_dial-10.00.wav");
  CHECK(unsoldered::clip_name("t", "h", std::nullopt) == "t_h_turn.wav");
}

TEST_CASE("The list of clips quotes what needs it and writes numbers alike in every locale") {
  const ClipRow clip{"a.wav", "with, \"quotes\"", 7.123456789012, -0.5, -12.3456789012};
  CHECK(csv({clip}) ==
        "file,hookup,dial,gain_db,peak_dbfs,peak_dbtp,loudness_lufs\n"
        "a.wav,\"with, \"\"quotes\"\"\",7.12345679,-0.5,-12.3456789,,\n");
  CHECK(json({clip}) ==
        "[\n {\"file\": \"a.wav\", \"hookup\": \"with, \\\"quotes\\\"\", \"dial\": 7.12345679, \"gain_db\": -0.5, "
        "\"peak_dbfs\": -12.3456789, \"peak_dbtp\": null, \"loudness_lufs\": null}\n]\n");
  CHECK(json({}) == "[\n]\n");
  for (const double value : {0.1, 1.0 / 3, 1e-7, 123456789.0, 1234567890.0, -1e300, 0.0, 5e-324}) {
    char text[64];
    std::snprintf(text, sizeof text, "%.9g", value);
    CHECK(unsoldered::format_number(value) == text);
  }
}

TEST_CASE("Progress shows percentage and time left, and nothing where no terminal is") {
  CHECK(unsoldered::progress_line("rendering", 25, 100, 10) == "rendering [#####---------------]  25 %  0:30 left");
  CHECK(unsoldered::progress_line("rendering", 0, 100, 10) == "rendering [--------------------]   0 %");
  CHECK(unsoldered::progress_line("rendering", 100, 100, 10) == "rendering [####################] 100 %  0:00 left");
  CHECK(unsoldered::progress_line("rendering", 1, 1000, 10) == "rendering [--------------------]   0 %  2:46:30 left");

  const TemporaryFolder folder;
  std::FILE* file = std::fopen((folder / "messages").c_str(), "w");
  REQUIRE(file != nullptr);
  {
    unsoldered::Progress progress("rendering", file);
    progress.expect(10);
    std::this_thread::sleep_for(std::chrono::milliseconds(250));
    progress.advance(5);
  }
  std::fclose(file);
  CHECK(fs::file_size(folder / "messages") == 0);
}
