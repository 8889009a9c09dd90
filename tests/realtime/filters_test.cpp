// `process` of the filters is fit for an audio callback: no allocation, lock or system call.
#include <unistd.h>

#include <cmath>
#include <memory>
#include <mutex>
#include <vector>

#include "dsp/convolver.h"
#include "dsp/moving_pot_filter.h"
#include "tests/catch.h"
#include "tests/dsp/example_hookups.h"
#include "tests/realtime/guard.h"

using namespace unsoldered;
using namespace unsoldered::test;

namespace {

struct Blocks {
  static constexpr int frames = 4800;
  std::vector<double> left = std::vector<double>(frames, 0.25);
  std::vector<double> right = std::vector<double>(frames, -0.5);
  std::vector<double> dials = std::vector<double>(frames);
  double* channels[2] = {left.data(), right.data()};

  Blocks() {
    for (int n = 0; n < frames; ++n) {
      left[static_cast<std::size_t>(n)] = std::sin(n * 0.1);
      dials[static_cast<std::size_t>(n)] = n < 1000 ? 10 : 5 + 5 * std::sin(n * 0.01);  // through both ends
    }
  }

  /// Blocks of many sizes, in place.
  template <typename Process>
  void in_parts(const Process& process) {
    int done = 0;
    for (int size = 1; done + size <= frames; done += size, size = size * 2 % 701 + 1) {
      double* now[2] = {channels[0] + done, channels[1] + done};
      process(now, size, dials.data() + done);
    }
  }
};

}  // namespace

TEST_CASE("The guard catches a planted allocation, lock and system call") {
  std::vector<int> list;
  CHECK(counted([&] { list.push_back(1); }).allocations == 1);
  std::unique_ptr<int> number = std::make_unique<int>(1);
  CHECK(counted([&] { number.reset(); }).allocations == 1);
  std::mutex mutex;
  CHECK(counted([&] { const std::lock_guard<std::mutex> lock(mutex); }).locks == 1);
  CHECK_FALSE(runs_without_system_calls([] { getppid(); }));
  CHECK(runs_without_system_calls([] {}));
}

TEST_CASE("A filter's process neither allocates nor locks nor calls the system, turning or held") {
  std::vector<NamedHookup> examples = example_hookups();
  NamedHookup no_load = examples[1];
  no_load.name = "no-load tone";
  no_load.hookup.tone->no_load = true;
  examples.push_back(no_load);
  for (const NamedHookup& example : examples) {
    INFO(example.name);
    for (const Knob knob : {Knob::volume, Knob::tone}) {
      if (knob == Knob::tone && !example.hookup.tone) continue;
      MovingPotFilter moving(example.hookup, knob, 48000, 2);
      HeldPotFilter held(example.hookup, 5, 48000, 2);
      Blocks sound;
      const auto play = [&] {
        sound.in_parts([&](double* const* now, int size, const double* dials) {
          moving.process(now, now, size, dials);
          held.process(now, now, size);
        });
        moving.reset();
        held.reset();
      };
      const Counts counts = counted(play);
      CHECK(counts.allocations == 0);
      CHECK(counts.locks == 0);
      CHECK(runs_without_system_calls(play));
    }
  }
}

TEST_CASE("A convolver's process neither allocates nor locks nor calls the system, in one piece or in parts") {
  for (const int taps : {500, 20000}) {
    Fir fir;
    fir.taps.assign(static_cast<std::size_t>(taps), 0.01);
    Convolver convolver(std::make_shared<const ConvolutionPlan>(fir));
    Blocks sound;
    const auto play = [&] {
      for (int done = 0; done < 2 * convolver.latency_frames(); done += Blocks::frames) {
        sound.in_parts([&](double* const* now, int size, const double*) { convolver.process(now[0], now[0], size); });
      }
      convolver.reset();
    };
    const Counts counts = counted(play);
    CHECK(counts.allocations == 0);
    CHECK(counts.locks == 0);
    CHECK(runs_without_system_calls(play));
  }
}
