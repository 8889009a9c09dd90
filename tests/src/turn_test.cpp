#include "src/turn.h"

#include <vector>

#include "dsp/error.h"
#include "src/dial_list.h"
#include "tests/catch.h"
#include "tests/src/sound_fixture.h"

using Catch::Approx;
using Catch::Matchers::ContainsSubstring;
using unsoldered::InputError;
using unsoldered::Turn;
using unsoldered::test::message_of;

namespace {

Turn turn(const char* text) { return Turn::parse(text, "--turn"); }

std::string refusal(const char* text) {
  return message_of<InputError>([&] { turn(text); });
}

}  // namespace

TEST_CASE("A turn is straight lines between its points, held outside them") {
  const Turn up = turn("1:2, 5:10");
  CHECK(up.dial(-1) == 2);
  CHECK(up.dial(0) == 2);
  CHECK(up.dial(1) == 2);
  CHECK(up.dial(2) == Approx(4).epsilon(1e-15));
  CHECK(up.dial(4.5) == Approx(9).epsilon(1e-15));
  CHECK(up.dial(5) == 10);
  CHECK(up.dial(1e9) == 10);
  CHECK(turn("3:7.5").dial(0) == 7.5);
}

TEST_CASE("Two points at one time are a ramp of 5 ms that starts there") {
  const Turn jump = turn("0:3,2:3,2:8,4:0");
  CHECK(jump.dial(2) == 3);
  CHECK(jump.dial(2.0025) == Approx(5.5).epsilon(1e-12));
  CHECK(jump.dial(2.005) == Approx(8).epsilon(1e-12));
  CHECK(jump.dial(3.0025) == Approx(4).epsilon(1e-12));  // half way from 2.005 s to 4 s
  CHECK(turn("0:0,0:10").dial(0.0025) == Approx(5));
}

TEST_CASE("A turn filled block by block is the turn at each frame's own time") {
  const Turn wobble = turn("0:0,0.01:10,0.01:4,0.03:4.5,0.031:10");
  constexpr double kRate = 44100;
  for (const int block : {1, 7, 64, 5000}) {
    std::vector<double> dials(static_cast<std::size_t>(block));
    for (std::int64_t first = -30; first < 2000; first += block) {
      wobble.fill(first, kRate, block, dials.data());
      for (int i = 0; i < block; ++i) {
        const double expected = wobble.dial(static_cast<double>(first + i) / kRate);
        if (dials[static_cast<std::size_t>(i)] != expected) {
          CAPTURE(block, first, i);
          REQUIRE(dials[static_cast<std::size_t>(i)] == expected);
        }
      }
    }
  }
}

TEST_CASE("A turn never leaves the scale, however its lines round") {
  const Turn steep = turn("0.1:0,0.3:10,0.7:0,1.1:10");
  std::vector<double> dials(100000);
  steep.fill(0, 77777, 100000, dials.data());
  for (const double dial : dials) {
    if (!(dial >= 0 && dial <= 10)) FAIL(dial);
  }
}

TEST_CASE("Turns that cannot be are refused with what is wrong and what is accepted") {
  CHECK_THAT(refusal(""), ContainsSubstring("seconds:dial"));
  CHECK_THAT(refusal("0:0,"), ContainsSubstring("seconds:dial"));
  CHECK_THAT(refusal("5"), ContainsSubstring("\"5\""));
  CHECK_THAT(refusal("0:0;8:10"), ContainsSubstring("0;8:10") || ContainsSubstring("seconds:dial"));
  CHECK_THAT(refusal("zero:1"), ContainsSubstring("zero:1"));
  CHECK_THAT(refusal("0:eleven"), ContainsSubstring("eleven"));
  CHECK_THAT(refusal("0:11"), ContainsSubstring("dial 11") && ContainsSubstring("0 to 10"));
  CHECK_THAT(refusal("0:-0.5"), ContainsSubstring("-0.5"));
  CHECK_THAT(refusal("0:nan"), ContainsSubstring("nan"));
  CHECK_THAT(refusal("inf:1"), ContainsSubstring("inf"));
  CHECK_THAT(refusal("-1:1"), ContainsSubstring("-1 s"));
  CHECK_THAT(refusal("2:1,1:5"), ContainsSubstring("order of their times"));
  CHECK_THAT(refusal("1:0,1:5,1:10"), ContainsSubstring("third"));
  CHECK_THAT(refusal("1:0,1:5,1.004:10"), ContainsSubstring("1.005 s"));
  CHECK(refusal("1:0,1:5,1.006:10").empty());
}

TEST_CASE("A turn names its knob, the volume knob when it names none") {
  CHECK(unsoldered::parse_knob_turn("0:0,8:10", "--turn").knob == "volume");
  const auto tone = unsoldered::parse_knob_turn("tone=0:10,4:0", "--turn");
  CHECK(tone.knob == "tone");
  CHECK(tone.turn.dial(2) == Approx(5));
  CHECK_THAT(message_of<InputError>([] { unsoldered::parse_knob_turn("=0:1", "--turn"); }),
             ContainsSubstring("names no knob"));
  CHECK_THAT(message_of<InputError>([] { unsoldered::parse_knob_turn("tone=0:12", "--turn"); }),
             ContainsSubstring("--turn tone") && ContainsSubstring("12"));
}

TEST_CASE("Dial lists keep their order and refuse what is not on the scale") {
  CHECK(unsoldered::parse_dials("10, 7.25,+3,0", "--dial") == std::vector<double>{10, 7.25, 3, 0});
  for (const char* bad : {"", "1,", "7;3", "ten", "1e400", "0x5", "--1", "++1", "nan"}) {
    CAPTURE(bad);
    CHECK_THAT(message_of<InputError>([&] { unsoldered::parse_dials(bad, "--dial"); }),
               ContainsSubstring("not a dial position"));
  }
  for (const char* off : {"11", "-0.001", "5,10.0001", "1e300"}) {
    CAPTURE(off);
    CHECK_THAT(message_of<InputError>([&] { unsoldered::parse_dials(off, "--dial"); }),
               ContainsSubstring("--dial") && ContainsSubstring("0 to 10"));
  }
}
