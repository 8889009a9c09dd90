#include "src/recorded_through.h"

#include <algorithm>
#include <cmath>
#include <memory>
#include <string>
#include <utility>
#include <vector>

#include "dsp/error.h"
#include "tests/catch.h"
#include "tests/src/sound_fixture.h"

using Catch::Matchers::ContainsSubstring;
using namespace unsoldered::test;
using unsoldered::ChannelPlans;
using unsoldered::Hookup;
using unsoldered::InputError;
using unsoldered::KnobMotion;
using unsoldered::parse_recorded_through;
using unsoldered::plan_undoing;
using unsoldered::RecordedThrough;
using unsoldered::TakeFormat;
using unsoldered::TurningKnob;
using unsoldered::UndoneTake;

namespace {

constexpr const char* kLine = R"(
[source]
kind = "line"
resistance = "100"
[volume]
resistance = "10k"
taper = "linear"
[load]
resistance = "1M"
)";

class ListTake : public unsoldered::Take {
 public:
  ListTake(std::vector<double> samples, int channels) : samples_(std::move(samples)), channels_(channels) {}
  TakeFormat format() const noexcept override {
    return {48000, channels_, static_cast<std::int64_t>(samples_.size()) / channels_};
  }
  int read(double* interleaved, int frames) override {
    const std::size_t count = std::min(static_cast<std::size_t>(frames * channels_), samples_.size() - next_);
    std::copy_n(samples_.begin() + static_cast<std::ptrdiff_t>(next_), count, interleaved);
    next_ += count;
    return static_cast<int>(count) / channels_;
  }

 private:
  std::vector<double> samples_;
  int channels_;
  std::size_t next_ = 0;
};

std::vector<double> read_all(unsoldered::Take& take, int block) {
  const auto channels = static_cast<std::size_t>(take.format().channels);
  std::vector<double> all;
  std::vector<double> some(static_cast<std::size_t>(block) * channels);
  while (const int frames = take.read(some.data(), block)) {
    all.insert(all.end(), some.begin(), some.begin() + frames * static_cast<std::ptrdiff_t>(channels));
  }
  return all;
}

}  // namespace

TEST_CASE("Recorded through: nothing, the instrument, or a hookup file with its dial") {
  const TemporaryFolder folder;
  const auto file = folder / "bench.hookup.toml";
  write_text(file, kLine);
  write_text(folder / "odd@home.toml", kLine);
  const Hookup first = plain_line_hookup();
  const auto parse = [&](const std::string& text) { return parse_recorded_through(text, first, "--recorded-through"); };
  CHECK_FALSE(parse("nothing"));
  CHECK(parse(file.string())->hookup.volume.dial == 10);
  CHECK(parse(file.string() + "@7.5")->hookup.volume.dial == 7.5);
  CHECK(parse(file.string() + "@7.5")->inputs.front() == file);
  CHECK(parse((folder / "odd@home.toml").string())->hookup.volume.dial == 10);
  CHECK(parse((folder / "odd@home.toml").string() + "@3")->hookup.volume.dial == 3);
  const auto refusal = [&](const std::string& text) { return message_of<InputError>([&] { parse(text); }); };
  CHECK_THAT(refusal(file.string() + "@11"), ContainsSubstring("dial 11") && ContainsSubstring("0 to 10"));
  CHECK_THAT(refusal(file.string() + "@loud"), ContainsSubstring("\"loud\"") && ContainsSubstring("0 to 10"));
  CHECK_THAT(refusal("amp"), ContainsSubstring("amp") && ContainsSubstring("nothing, instrument, or a hookup file"));
  CHECK_THAT(refusal(""), ContainsSubstring("instrument"));
}

TEST_CASE("The instrument is the source, its volume pot at 10 and a lead, nothing else") {
  Hookup first = plain_line_hookup();
  first.volume.dial = 4;
  first.volume.pot.end_ohm = 20;
  first.treble_bleed.emplace().capacitor_f = 1e-9;
  first.tone.emplace().capacitor_f = 22e-9;
  first.load.coupling_f = 22e-9;
  first.load.resistance_ohm = 47e3;
  const auto instrument = parse_recorded_through("instrument", first, "--recorded-through");
  REQUIRE(instrument);
  const Hookup& lead = instrument->hookup;
  CHECK(lead.source.resistance_ohm == first.source.resistance_ohm);
  CHECK(lead.volume.pot.total_ohm == first.volume.pot.total_ohm);
  CHECK(lead.volume.pot.end_ohm == 20);
  CHECK(lead.volume.dial == 10);
  CHECK(lead.cable->capacitance_f == Catch::Approx(300e-12));
  CHECK(lead.load.resistance_ohm == 1e6);
  CHECK(lead.load.capacitance_f == 0);
  CHECK_FALSE(lead.load.coupling_f);
  CHECK_FALSE(lead.treble_bleed);
  CHECK_FALSE(lead.tone);
  CHECK_FALSE(instrument->second);
}

TEST_CASE("The positions in use are the dials, or all that a turn passes") {
  const Hookup hookup = plain_line_hookup();
  const auto held = unsoldered::knob_positions(hookup, {KnobMotion(3.0), KnobMotion(7.25)});
  REQUIRE(held.size() == 2);
  CHECK(held[1].volume.dial == 7.25);
  const auto turn = [](const char* text) { return unsoldered::Turn::parse(text, "--turn"); };
  const std::vector<TurningKnob> knobs = {{unsoldered::Knob::volume, turn("0:2.03,1:8,2:4.57")}};
  std::vector<double> dials;
  for (const Hookup& one : unsoldered::knob_positions(hookup, {KnobMotion(knobs)})) dials.push_back(one.volume.dial);
  std::sort(dials.begin(), dials.end());
  CHECK(dials.front() <= 2.03);
  CHECK(dials.back() == 8);
  for (std::size_t i = 1; i < dials.size(); ++i) REQUIRE(dials[i] - dials[i - 1] < 0.101);
  CHECK(dials.size() < 80);
  Hookup toned = hookup;
  toned.tone.emplace().capacitor_f = 22e-9;
  const std::vector<TurningKnob> both = {{unsoldered::Knob::volume, turn("0:0,1:10")},
                                         {unsoldered::Knob::tone, turn("0:10,1:0")}};
  for (const Hookup& one : unsoldered::knob_positions(toned, {KnobMotion(both)})) {
    REQUIRE(std::abs(one.volume.dial + one.tone->dial - 10) < 0.11);
  }
}

TEST_CASE("An undone take is as long as the take behind its lead, whatever is read at a time") {
  RecordedThrough recorded{"half", plain_line_hookup(), {}, {}};
  recorded.hookup.volume.dial = 5;
  std::vector<std::string> messages;
  for (const int channels : {1, 3}) {
    for (const int frames : {1, 100, 50000}) {
      std::vector<double> samples;
      for (int i = 0; i < frames * channels; ++i)
        samples.push_back(std::sin(0.001 * i / channels) * (1 + i % channels));
      const TakeFormat format{48000, channels, frames};
      const ChannelPlans plans = plan_undoing(recorded, 24, "played", {plain_line_hookup()}, format, messages);
      for (const int block : {1000, 16384, 40001}) {
        UndoneTake take(std::make_unique<ListTake>(samples, channels), plans);
        std::vector<double> got = read_all(take, block);
        const auto lead = static_cast<std::ptrdiff_t>(take.lead_frames()) * channels;
        REQUIRE(got.size() == samples.size() + static_cast<std::size_t>(lead));
        got.erase(got.begin(), got.begin() + lead);
        // 5000 ohm of 10k: half, with 100 ohm in front and 1M behind it a little less.
        const double level = 1 / (5000.0 / 10100 * (1 / (1 + 5000.0 * 5100 / 10100 / 1e6)));
        for (std::size_t i = 5000; i + 5000 < got.size(); ++i) REQUIRE(std::abs(got[i] - level * samples[i]) < 1e-3);
      }
    }
  }
  CHECK(messages.empty());
}

TEST_CASE("Each half of a stereo pot is undone in its own channels") {
  RecordedThrough recorded{"stereo", plain_line_hookup(), {}, {}};
  recorded.hookup.volume.dial = 5;
  recorded.hookup.volume.right = recorded.hookup.volume.pot;
  recorded.hookup.volume.right->taper = unsoldered::parse_taper("audio 10%");
  std::vector<std::string> messages;
  const ChannelPlans plans = plan_undoing(recorded, 60, "played", {plain_line_hookup()}, {48000, 4, 0}, messages);
  REQUIRE(plans.size() == 4);
  CHECK(plans[0] == plans[2]);
  CHECK(plans[1] == plans[3]);
  CHECK(plans[0] != plans[1]);
  std::vector<double> ones(4 * 20000, 0.01);
  UndoneTake take(std::make_unique<ListTake>(ones, 4), plans);
  const std::vector<double> got = read_all(take, 5000);
  CHECK(got[4 * 10000] == Catch::Approx(0.02 * 1.01).epsilon(0.01));
  CHECK(got[4 * 10000 + 1] == Catch::Approx(0.1 * 1.01).epsilon(0.01));
}

TEST_CASE("What is limited, beyond reach or silent is said in words with its frequency") {
  const TakeFormat format{48000, 1, 0};
  std::vector<std::string> messages;
  RecordedThrough recorded{"the bench at dial 10", plain_line_hookup(), {}, {}};
  recorded.hookup.volume.dial = 10;
  recorded.hookup.source.resistance_ohm = 10e3;
  recorded.hookup.cable.emplace().capacitance_f = 1e-6;
  recorded.hookup.load.coupling_f = 10e-9;
  plan_undoing(recorded, 12, "b.hookup.toml", {plain_line_hookup()}, format, messages);
  REQUIRE(messages.size() == 2);
  CHECK_THAT(messages[0],
             ContainsSubstring("b.hookup.toml: ") && ContainsSubstring(" Hz up the boost is held at 12 dB"));
  CHECK_THAT(messages[1], ContainsSubstring("below 6 Hz what the bench at dial 10 took cannot be undone"));
  recorded.hookup.volume.dial = 0;
  CHECK_THAT(message_of<InputError>([&] { plan_undoing(recorded, 12, "b", {plain_line_hookup()}, format, messages); }),
             ContainsSubstring("the bench at dial 10") && ContainsSubstring("nothing comes through"));
}

TEST_CASE("A take that starts at full swing comes back from its first sample on, held and turning") {
  const Hookup hookup = plain_line_hookup();
  RecordedThrough recorded{"the same", hookup, {}, {}};
  recorded.hookup.volume.dial = 7;
  recorded.hookup.cable.emplace().capacitance_f = 10e-9;  // 8 kHz: boosted far up
  std::vector<double> samples;
  for (int i = 0; i < 20000; ++i) samples.push_back(0.5 * std::cos(0.05 * i));
  samples[0] = 0.5;
  std::vector<std::string> messages;
  const ChannelPlans plans = plan_undoing(recorded, 60, "same", {recorded.hookup}, {48000, 1, 20000}, messages);
  const auto played = [&](const KnobMotion& motion) {
    UndoneTake take(std::make_unique<ListTake>(samples, 1), plans);
    std::vector<double> clip;
    play_through(take, recorded.hookup, motion, [&](const double* const* channels, int frames) {
      clip.insert(clip.end(), channels[0], channels[0] + frames);
      return true;
    });
    return clip;
  };
  const std::vector<TurningKnob> knobs = {{unsoldered::Knob::volume, unsoldered::Turn::parse("0:7,1:7", "--turn")}};
  for (const KnobMotion& motion : {KnobMotion(7.0), KnobMotion(knobs)}) {
    const std::vector<double> clip = played(motion);
    REQUIRE(clip.size() == samples.size());
    // The jump at the start has much above the pass band, which is not brought back.
    CHECK(std::abs(clip[0] - samples[0]) < 0.05);
    for (std::size_t i = 0; i < 100; ++i) CHECK(std::abs(clip[i] - samples[i]) < 0.06);
    for (std::size_t i = 1000; i < 19900; ++i) REQUIRE(std::abs(clip[i] - samples[i]) < 1e-3);
  }
}
