#include "src/heard_through.h"

#include <cmath>
#include <string>
#include <vector>

#include "dsp/error.h"
#include "tests/catch.h"
#include "tests/src/sound_fixture.h"

using Catch::Matchers::ContainsSubstring;
using namespace unsoldered::test;
using unsoldered::ConvolvedStream;
using unsoldered::InputError;
using unsoldered::open_heard_through;
using unsoldered::TakeFormat;

namespace {

Sound response(std::vector<double> samples, int channels = 1, int rate_hz = 48000) {
  return {rate_hz, channels, SF_FORMAT_WAV | SF_FORMAT_FLOAT, std::move(samples)};
}

}  // namespace

TEST_CASE("Heard through: nothing, the loudspeaker by either name, or an impulse response") {
  const TemporaryFolder folder;
  const TakeFormat take{48000, 2, 0};
  const auto open = [&](const std::string& text) { return open_heard_through(text, take, "--heard-through"); };
  CHECK_FALSE(open("nothing"));
  CHECK(open("guitar loudspeaker")->plans.size() == 2);
  CHECK(open("guitar-loudspeaker")->plans.size() == 2);
  write_sound(folder / "mono.wav", response({1, 0.5}));
  write_sound(folder / "stereo.wav", response({1, 0.5, 0, 0}, 2));
  const auto mono = open((folder / "mono.wav").string());
  CHECK(mono->plans[0] == mono->plans[1]);
  CHECK(mono->inputs.front() == folder / "mono.wav");
  const auto stereo = open((folder / "stereo.wav").string());
  CHECK(stereo->plans[0] != stereo->plans[1]);
}

TEST_CASE("An impulse response that does not fit the take is refused with what would") {
  const TemporaryFolder folder;
  const auto refusal = [&](const Sound& sound, const TakeFormat& take) {
    write_sound(folder / "ir.wav", sound);
    return message_of<InputError>([&] { open_heard_through((folder / "ir.wav").string(), take, "--heard-through"); });
  };
  CHECK_THAT(refusal(response({1}, 1, 44100), {48000, 1, 0}),
             ContainsSubstring("44100 Hz") && ContainsSubstring("48000 Hz"));
  CHECK_THAT(refusal(response({1, 1, 1}, 3), {48000, 2, 0}), ContainsSubstring("3 channels for a take of 2"));
  CHECK_THAT(refusal(response({1, 1}, 2), {48000, 1, 0}), ContainsSubstring("2 channels for a take of 1"));
  CHECK_THAT(refusal(response({0, 0, 0}), {48000, 1, 0}), ContainsSubstring("silent"));
  CHECK_THAT(refusal(response(std::vector<double>(480001, 0.1)), {48000, 1, 0}), ContainsSubstring("longer than 10 s"));
  CHECK(refusal(response(std::vector<double>(480000, 0.1)), {48000, 1, 0}).empty());
  CHECK_THAT(refusal(response({0.5, std::nan("")}), {48000, 1, 0}),
             ContainsSubstring("impulse response") && ContainsSubstring("nan"));
}

TEST_CASE("A convolved stream gives as many frames as it was given, lined up, in blocks of any size") {
  unsoldered::Fir late;
  late.taps.assign(701, 0.0);
  late.taps[0] = 0.25;
  late.taps[300] = 1;  // time zero
  late.taps[700] = 0.5;
  late.before = 300;
  unsoldered::Fir plain;
  plain.taps = {2};
  const auto plans = unsoldered::make_plans({late, plain}, {0, 1});
  for (const int length : {0, 1, 299, 5000, 40000}) {
    std::vector<double> in;
    for (int n = 0; n < length; ++n) in.push_back(n % 97 - 48);
    ConvolvedStream stream(plans);
    std::vector<double> got[2];
    const auto sink = [&](const double* const* channels, int frames) {
      for (std::size_t c = 0; c < 2; ++c) got[c].insert(got[c].end(), channels[c], channels[c] + frames);
      return true;
    };
    for (int done = 0, size = 1; done < length; done += size, size = size * 3 % 20011 + 1) {
      size = std::min(size, length - done);
      const double* channels[2] = {in.data() + done, in.data() + done};
      REQUIRE(stream.push(channels, size, sink));
    }
    REQUIRE(stream.finish(sink));
    REQUIRE(got[0].size() == in.size());
    REQUIRE(got[1].size() == in.size());
    const auto at = [&](int n) { return n >= 0 && n < length ? in[static_cast<std::size_t>(n)] : 0.0; };
    for (int n = 0; n < length; ++n) {
      const auto i = static_cast<std::size_t>(n);
      REQUIRE(std::abs(got[0][i] - (0.25 * at(n + 300) + at(n) + 0.5 * at(n - 400))) < 1e-10);
      REQUIRE(std::abs(got[1][i] - 2 * at(n)) < 1e-10);
    }
  }
}

TEST_CASE("A sink that says stop is not called again") {
  unsoldered::Fir fir;
  fir.taps = {1};
  ConvolvedStream stream(unsoldered::make_plans({fir}, {0}));
  const std::vector<double> in(100000, 1.0);
  const double* channel = in.data();
  int calls = 0;
  CHECK_FALSE(stream.push(&channel, 100000, [&](const double* const*, int) { return ++calls < 2; }));
  CHECK(calls == 2);
}
