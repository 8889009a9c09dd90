// Loudness and true peak against the signals of EBU Tech 3341 and the anchor of ITU-R BS.1770-4, and against what
// libebur128 1.2.6 was seen to give for each (the tighter bound).
#include "src/loudness.h"

#include <algorithm>
#include <cmath>
#include <numbers>
#include <vector>

#include "src/loudness_match.h"
#include "tests/catch.h"

using Catch::Matchers::WithinAbs;
using unsoldered::Loudness;
using unsoldered::LoudnessMeter;

namespace {

using Channels = std::vector<std::vector<double>>;

struct Part {
  double level_dbfs;  // of the sine's peak; silence when below -200
  double seconds;
};

double factor(double db) { return std::pow(10, db / 20); }

/// One sine through all parts, its phase running on.
std::vector<double> tone(const std::vector<Part>& parts, double hz, int rate_hz) {
  std::vector<double> samples;
  for (const Part& part : parts) {
    const double level = part.level_dbfs < -200 ? 0 : factor(part.level_dbfs);
    for (auto left = std::llround(part.seconds * rate_hz); left > 0; --left) {
      const auto at = static_cast<double>(samples.size());
      samples.push_back(level * std::sin(2 * std::numbers::pi * hz * at / rate_hz));
    }
  }
  return samples;
}

Loudness measured(const Channels& channels, int rate_hz, int block = 1000) {
  LoudnessMeter meter(rate_hz, static_cast<int>(channels.size()));
  const std::size_t frames = channels.front().size();
  for (std::size_t done = 0; done < frames; done += static_cast<std::size_t>(block)) {
    std::vector<const double*> from;
    for (const auto& channel : channels) from.push_back(channel.data() + done);
    meter.add(from.data(), static_cast<int>(std::min(frames - done, static_cast<std::size_t>(block))));
  }
  return meter.finish();
}

double stereo_lufs(const std::vector<Part>& parts, int rate_hz = 48000) {
  const auto channel = tone(parts, 1000, rate_hz);
  return measured({channel, channel}, rate_hz).integrated_lufs();
}

double mono_lufs(double level_dbfs, double hz, double seconds, int rate_hz = 48000) {
  return measured({tone({{level_dbfs, seconds}}, hz, rate_hz)}, rate_hz).integrated_lufs();
}

constexpr double kTight = 0.005;  // of what the library gave

}  // namespace

TEST_CASE("997 Hz at full scale in one front channel is -3.01 LUFS, a mono file being that channel") {
  CHECK_THAT(mono_lufs(0, 997, 20), WithinAbs(-3.01, 0.1));  // ITU-R BS.1770-4
  CHECK_THAT(mono_lufs(0, 997, 20), WithinAbs(-3.0103, kTight));
  CHECK_THAT(mono_lufs(0, 1000, 20), WithinAbs(-3.0036, kTight));
  CHECK_THAT(mono_lufs(0, 997, 20, 44100), WithinAbs(-3.0075, kTight));
  const auto channel = tone({{0, 20}}, 997, 48000);
  CHECK_THAT(measured({channel, channel}, 48000).integrated_lufs(), WithinAbs(0, kTight));
  const auto quiet = tone({{-23, 20}}, 997, 48000);
  const std::vector<double> silent(quiet.size());
  CHECK_THAT(measured({quiet, silent}, 48000).integrated_lufs(), WithinAbs(-26.0103, kTight));
}

TEST_CASE("EBU Tech 3341, cases 1 to 5: tones through both gates") {
  struct Case {
    std::vector<Part> parts;
    double required, at_48000, at_44100;
  };
  const std::vector<Case> cases = {
      {{{-23, 20}}, -23, -22.9933, -22.9905},
      {{{-33, 20}}, -33, -32.9933, -32.9905},
      {{{-36, 10}, {-23, 60}, {-36, 10}}, -23, -23.0139, -23.0111},
      {{{-72, 10}, {-36, 10}, {-23, 60}, {-36, 10}, {-72, 10}}, -23, -23.0139, -23.0111},
      {{{-26, 20}, {-20, 20.1}, {-26, 20}}, -23, -22.9787, -22.9759},
  };
  for (std::size_t i = 0; i < cases.size(); ++i) {
    CAPTURE(i + 1);
    const double at_48000 = stereo_lufs(cases[i].parts);
    CHECK_THAT(at_48000, WithinAbs(cases[i].required, 0.1));
    CHECK_THAT(at_48000, WithinAbs(cases[i].at_48000, kTight));
    CHECK_THAT(stereo_lufs(cases[i].parts, 44100), WithinAbs(cases[i].at_44100, kTight));
  }
}

TEST_CASE("EBU Tech 3341, case 6: five channels, the surround ones weighing more") {
  for (const int rate : {48000, 44100}) {
    const auto at = [&](double level) { return tone({{level, 20}}, 1000, rate); };
    const double lufs = measured({at(-28), at(-28), at(-24), at(-30), at(-30)}, rate).integrated_lufs();
    CHECK_THAT(lufs, WithinAbs(-23, 0.1));
    CHECK_THAT(lufs, WithinAbs(rate == 48000 ? -23.0163 : -23.0135, kTight));
  }
}

TEST_CASE("The fourth of six channels, the low-frequency one, counts nothing, of four it is a surround") {
  const auto loud = tone({{-23, 5}}, 1000, 48000);
  const std::vector<double> none(loud.size());
  const double front = measured({loud, none, none, none, none, none}, 48000).integrated_lufs();
  CHECK_THAT(front, WithinAbs(-26.0036, kTight));
  CHECK(measured({none, none, none, loud, none, none}, 48000).integrated_lufs() < -1000);
  CHECK_THAT(measured({none, none, none, none, loud, none}, 48000).integrated_lufs(),
             WithinAbs(front + 10 * std::log10(1.41), kTight));
  CHECK_THAT(measured({none, none, none, loud}, 48000).integrated_lufs(),
             WithinAbs(front + 10 * std::log10(1.41), kTight));
  // The side pair of eight stands at 90 degrees, the rear pair beyond 120, where the standard's weight is 1 again.
  CHECK_THAT(measured({none, none, none, none, none, none, loud, none}, 48000).integrated_lufs(),
             WithinAbs(front + 10 * std::log10(1.41), kTight));
  CHECK_THAT(measured({none, none, none, none, loud, none, none, none}, 48000).integrated_lufs(),
             WithinAbs(front, kTight));
}

TEST_CASE("The relative gate takes out what lies 10 LU below, nothing else") {
  CHECK_THAT(stereo_lufs({{-30, 10}, {-45, 10}}), WithinAbs(-30.0568, kTight));
  CHECK_THAT(stereo_lufs({{-20, 10}, {-26, 10}}), WithinAbs(-22.0304, kTight));
}

TEST_CASE("Pure tones measure as the weighting curve says") {
  const std::vector<std::pair<double, double>> tones = {
      {20, -36.9769},   {50, -27.6360},   {100, -24.8351},  {200, -23.9663},  {500, -23.6589},
      {1000, -23.0036}, {2000, -20.6301}, {4000, -19.7333}, {8000, -19.6619}, {10000, -19.6594}};
  for (const auto& [hz, lufs] : tones) {
    CAPTURE(hz);
    CHECK_THAT(mono_lufs(-20, hz, 10), WithinAbs(lufs, kTight));
  }
}

namespace {

struct Readings {
  std::vector<double> momentary;  // every 10 ms
  std::vector<double> short_term;

  double most(const std::vector<double>& readings, double from_s, double to_s) const {
    const auto at = [&](double seconds) { return readings.begin() + std::lround(100 * seconds); };
    return *std::max_element(at(from_s), at(to_s));
  }
  double least(const std::vector<double>& readings, double from_s, double to_s) const {
    const auto at = [&](double seconds) { return readings.begin() + std::lround(100 * seconds); };
    return *std::min_element(at(from_s), at(to_s));
  }
};

/// A stereo tone of 1 kHz read as a meter is.
Readings read_meter(const std::vector<Part>& parts) {
  const std::vector<double> channel = tone(parts, 1000, 48000);
  LoudnessMeter meter(48000, 2);
  Readings readings;
  for (std::size_t done = 0; done + 480 <= channel.size(); done += 480) {
    const double* both[] = {channel.data() + done, channel.data() + done};
    meter.add(both, 480);
    readings.momentary.push_back(meter.momentary_lufs());
    readings.short_term.push_back(meter.short_term_lufs());
  }
  return readings;
}

constexpr double kSilent = -300;

}  // namespace

TEST_CASE("EBU Tech 3341, cases 9 and 12: readings that stay where they are") {
  std::vector<Part> parts;
  for (int i = 0; i < 5; ++i) parts.insert(parts.end(), {{-20, 1.34}, {-30, 1.66}});
  const Readings nine = read_meter(parts);
  CHECK_THAT(nine.most(nine.short_term, 3, 15), WithinAbs(-23, 0.1));
  CHECK_THAT(nine.least(nine.short_term, 3, 15), WithinAbs(-23, 0.1));
  parts.clear();
  for (int i = 0; i < 25; ++i) parts.insert(parts.end(), {{-20, 0.18}, {-30, 0.22}});
  const Readings twelve = read_meter(parts);
  CHECK_THAT(twelve.most(twelve.momentary, 1, 10), WithinAbs(-23, 0.1));
  CHECK_THAT(twelve.least(twelve.momentary, 1, 10), WithinAbs(-23, 0.1));
}

TEST_CASE("EBU Tech 3341, cases 10 and 13: a burst wherever it begins") {
  for (int i = 0; i < 20; ++i) {
    CAPTURE(i);
    const Readings ten = read_meter({{kSilent, 0.15 * i}, {-23, 3}, {kSilent, 1}});
    CHECK_THAT(ten.most(ten.short_term, 0, 3 + 0.15 * i), WithinAbs(-23, 0.1));
    const Readings thirteen = read_meter({{kSilent, 0.02 * i}, {-23, 0.4}, {kSilent, 1}});
    CHECK_THAT(thirteen.most(thirteen.momentary, 0, 0.4 + 0.02 * i), WithinAbs(-23, 0.1));
  }
}

TEST_CASE("EBU Tech 3341, cases 11 and 14: bursts a decibel apart, each read as it is") {
  std::vector<Part> slow;
  std::vector<Part> fast;
  for (int i = 0; i < 20; ++i) {
    const double level = -38 + i;
    slow.insert(slow.end(), {{kSilent, 0.15 * i}, {level, 3}, {kSilent, 3 - 0.15 * i}});
    fast.insert(fast.end(), {{kSilent, 0.02 * i}, {level, 0.4}, {kSilent, 0.4 - 0.02 * i}});
  }
  const Readings eleven = read_meter(slow);
  const Readings fourteen = read_meter(fast);
  for (int i = 0; i < 20; ++i) {
    CAPTURE(i);
    CHECK_THAT(eleven.most(eleven.short_term, 6 * i, 6 * (i + 1)), WithinAbs(-38 + i, 0.1));
    CHECK_THAT(fourteen.most(fourteen.momentary, 0.8 * i, 0.8 * (i + 1)), WithinAbs(-38 + i, 0.1));
  }
}

TEST_CASE("EBU Tech 3341, cases 15 to 19: peaks between the samples") {
  struct Case {
    double divisor, amplitude, phase_deg, required, library;
  };
  for (const Case& wave :
       {Case{4, 0.50, 0, -6, -6.0206}, Case{4, 0.50, 45, -6, -6.0538}, Case{6, 0.50, 60, -6, -6.0055},
        Case{8, 0.50, 67.5, -6, -6.0188}, Case{4, 1.41, 45, 3, 2.9512}}) {
    CAPTURE(wave.divisor, wave.phase_deg);
    std::vector<double> samples(48000);
    constexpr std::size_t kFade = 480;  // without it the onset itself overshoots between the samples
    for (std::size_t i = 0; i < samples.size(); ++i) {
      const double phase = 2 * std::numbers::pi * (static_cast<double>(i) / wave.divisor + wave.phase_deg / 360);
      const auto from_end = static_cast<double>(std::min({i, samples.size() - 1 - i, kFade}));
      const double fade = 0.5 - 0.5 * std::cos(std::numbers::pi * from_end / static_cast<double>(kFade));
      samples[i] = wave.amplitude * fade * std::sin(phase);
    }
    const double peak = 20 * std::log10(measured({samples}, 48000).true_peak());
    CHECK(peak <= wave.required + 0.2);
    CHECK(peak >= wave.required - 0.4);
    CHECK_THAT(peak, WithinAbs(wave.library, kTight));
  }
}

TEST_CASE("The peak after the very last samples is seen") {
  std::vector<double> samples(48000);
  for (std::size_t i = 47900; i < samples.size(); ++i) {
    samples[i] =
        std::sin(2 * std::numbers::pi * (static_cast<double>(i) / 4 + 0.125)) * (static_cast<double>(i - 47900) / 100);
  }
  const double at_end = measured({samples}, 48000).true_peak();
  samples.resize(48200);
  CHECK_THAT(at_end, WithinAbs(measured({samples}, 48000).true_peak(), 1e-9));
}

TEST_CASE("Blocks of any size measure the same") {
  const auto channel = tone({{-20, 4}, {-40, 3}}, 440, 44100);
  const Loudness once = measured({channel, channel}, 44100, 1000000);
  for (const int block : {1, 441, 4410, 5000}) {
    const Loudness parts = measured({channel, channel}, 44100, block);
    CHECK_THAT(parts.integrated_lufs(), WithinAbs(once.integrated_lufs(), 1e-9));
    CHECK(parts.true_peak() == once.true_peak());
  }
}

TEST_CASE("Clips under 3 s are measured as a whole, however short") {
  // By hand: a tone and twice as much silence is 10 log10(3) = 4.77 dB below the tone alone; the gate would take it out.
  CHECK_THAT(stereo_lufs({{-23, 0.9}, {-300, 1.8}}), WithinAbs(-22.9936 - 4.7712, 0.02));
  CHECK_THAT(stereo_lufs({{-23, 0.2}}), WithinAbs(-22.99, 0.05));
  // From 3 s on gated: blocks of 400 ms every 100 ms, six of them full and three holding 3/4, 1/2 and 1/4 of the tone.
  CHECK_THAT(stereo_lufs({{-23, 0.9}, {-300, 2.1}}), WithinAbs(-22.9936 + 10 * std::log10(7.5 / 9), 0.02));
  CHECK(stereo_lufs({{-300, 1}}) < -1000);
  CHECK(stereo_lufs({{-300, 5}}) < -1000);
  CHECK(stereo_lufs({{-75, 5}}) < -1000);
}

TEST_CASE("What a clip measures at a gain is what the clip with that gain measures") {
  const std::vector<Part> parts = {{-80, 4}, {-66, 4}, {-60, 4}};
  const auto channel = tone(parts, 1000, 48000);
  const Loudness whole = measured({channel, channel}, 48000);
  for (const double db : {-6.0, 0.0, 8.0, 30.0}) {
    auto raised = channel;
    for (double& sample : raised) sample *= factor(db);
    const Loudness direct = measured({raised, raised}, 48000);
    CAPTURE(db);
    CHECK_THAT(whole.integrated_lufs(factor(db)), WithinAbs(direct.integrated_lufs(), 1e-6));
    CHECK_THAT(whole.true_peak(factor(db)), WithinAbs(direct.true_peak(), 1e-6 * direct.true_peak()));
  }
}

TEST_CASE("Matched clips have one loudness, one of them stands at the ceiling and none above") {
  const double ceiling = factor(-1);
  std::vector<Loudness> clips;
  clips.push_back(measured({tone({{-6, 4}}, 1000, 48000)}, 48000));
  clips.push_back(measured({tone({{-30, 4}}, 100, 48000)}, 48000));  // needs the most peak for its loudness
  clips.push_back(measured({tone({{-69, 4}, {-75, 4}, {-64, 1}}, 3000, 48000)}, 48000));  // blocks at the absolute gate
  clips.push_back(measured({tone({{-300, 4}}, 1000, 48000)}, 48000));
  std::vector<const Loudness*> set;
  for (const Loudness& clip : clips) set.push_back(&clip);
  const auto gains = unsoldered::match_loudness(set, ceiling);
  CHECK(gains[3].left_out);
  CHECK(gains[3].gain == 1);
  double most = 0;
  for (std::size_t i = 0; i < 3; ++i) {
    CHECK_FALSE(gains[i].left_out);
    CHECK_THAT(clips[i].integrated_lufs(gains[i].gain), WithinAbs(clips[1].integrated_lufs(gains[1].gain), 1e-6));
    most = std::max(most, clips[i].true_peak(gains[i].gain));
  }
  CHECK_THAT(most, WithinAbs(ceiling, 1e-12));
}
