// Which channel of a take goes through what: gangs of stereo pots, second sources. Resistive hookups, so that numbers show it.
#include "src/play_through.h"

#include "dsp/error.h"
#include "tests/catch.h"

using namespace unsoldered;
using Catch::Matchers::WithinAbs;

namespace {

constexpr int kFrames = 3000;

/// A take whose channels are constants.
class Constants : public Take {
 public:
  explicit Constants(std::vector<double> values) : values_(std::move(values)) {}
  TakeFormat format() const noexcept override { return {48000, static_cast<int>(values_.size()), kFrames}; }
  int read(double* interleaved, int frames) override {
    const int count = std::min(frames, kFrames - done_);
    for (int n = 0; n < count; ++n)
      for (const double value : values_) *interleaved++ = value;
    done_ += count;
    return count;
  }

 private:
  std::vector<double> values_;
  int done_ = 0;
};

/// What each channel settles at.
std::vector<double> played(const std::vector<double>& take, const Hookup& hookup, const KnobMotion& motion) {
  Constants constants(take);
  std::vector<double> last(take.size());
  std::int64_t frames = play_through(constants, hookup, motion, [&](const double* const* channels, int count) {
    // The middle: at the very end the curve between samples already knows of the silence that follows.
    for (std::size_t channel = 0; channel < last.size(); ++channel) last[channel] = channels[channel][count / 2];
    return true;
  });
  CHECK(frames == kFrames);
  return last;
}

/// An ideal line source into a linear pot and nothing else: the gain is dial / 10.
Hookup divider() {
  Hookup hookup;
  hookup.source.kind = SourceKind::line;
  hookup.volume.pot.total_ohm = 10e3;
  hookup.load.resistance_ohm = 1e15;
  return hookup;
}

Hookup two_dividers() {
  Hookup hookup = divider();
  hookup.source.resistance_ohm = 1000;
  hookup.volume.pot.total_ohm = 1e12;
  SecondSource second;
  second.source = hookup.source;
  hookup.second = second;
  return hookup;
}

}  // namespace

TEST_CASE("Odd channels go through the left gang of a stereo pot, even ones through the right") {
  Hookup hookup = divider();
  hookup.volume.right = hookup.volume.pot;
  hookup.volume.right->taper = parse_taper("audio 15%");
  const std::vector<double> out = played({0.8, 0.8, 0.4}, hookup, 5.0);
  CHECK_THAT(out[0], WithinAbs(0.4, 1e-6));
  CHECK_THAT(out[1], WithinAbs(0.12, 1e-6));
  CHECK_THAT(out[2], WithinAbs(0.2, 1e-6));
}

TEST_CASE("A channel that is the second source's adds to the others and is heard nowhere by itself") {
  Hookup hookup = two_dividers();
  // Without a channel of its own the second source only loads: half of every channel is left.
  CHECK_THAT(played({0.8, 0.2}, hookup, 10.0)[1], WithinAbs(0.1, 1e-6));
  hookup.second_channel = 2;
  const std::vector<double> stereo = played({0.8, 0.2}, hookup, 10.0);
  CHECK_THAT(stereo[0], WithinAbs(0.5, 1e-6));
  CHECK(stereo[1] == stereo[0]);
  hookup.selector.out_of_phase = true;
  CHECK_THAT(played({0.8, 0.2}, hookup, 10.0)[0], WithinAbs(0.3, 1e-6));
  // In a mono take the one channel is the emf of both, and so they cancel out of phase.
  hookup.second_channel = 1;
  CHECK_THAT(played({0.8}, hookup, 10.0)[0], WithinAbs(0, 1e-6));
  hookup.selector.out_of_phase = false;
  CHECK_THAT(played({0.8}, hookup, 10.0)[0], WithinAbs(0.8, 1e-6));
}

TEST_CASE("A take without the second source's channel is refused with how many it has") {
  Hookup hookup = two_dividers();
  hookup.second_channel = 2;
  CHECK_THROWS_WITH(played({0.8}, hookup, 10.0), Catch::Matchers::ContainsSubstring("second_channel 2") &&
                                                     Catch::Matchers::ContainsSubstring("1 channel;"));
}

TEST_CASE("Two knobs that turn at once both act") {
  Hookup hookup = divider();
  Stage pedal;
  pedal.volume = Volume{};
  pedal.volume->pot.total_ohm = 1e9;
  hookup.then.push_back(pedal);
  const std::vector<TurningKnob> knobs = {
      {Knob::volume, Turn::parse("0:10,0.01:5", "--turn")},
      {parse_knob(hookup, "pedal"), Turn::parse("0:10,0.02:2", "--turn")},
  };
  CHECK_THAT(played({0.8}, hookup, knobs)[0], WithinAbs(0.8 * 0.5 * 0.2, 1e-5));
}
