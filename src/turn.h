// A turn: a dial position that changes with time, straight lines between points.
//
//   "0:0,8:10"   seconds:dial; held before the first point and after the last.
//
// Two points at one time are a jump, played as a ramp of 5 ms that starts at that time (no hand and no wiper jumps).
#pragma once

#include <cstdint>
#include <string>
#include <string_view>
#include <vector>

namespace unsoldered {

struct TurnPoint {
  double seconds = 0;
  double dial = 0;  // 0..10
};

class Turn {
 public:
  /// At least one point; times from 0 on, never falling, at most two at one time, a jump finished before the next
  /// point. Throws InputError, its message opened by `where` ("--turn").
  Turn(std::vector<TurnPoint> points, std::string_view where);

  /// As the constructor, from "seconds:dial,seconds:dial,…".
  static Turn parse(std::string_view text, std::string_view where);

  /// Where straight lines meet, jumps already ramps: times strictly rising.
  const std::vector<TurnPoint>& corners() const noexcept { return corners_; }

  /// Dial position at a time; any thread.
  double dial(double seconds) const noexcept;

  /// dials[i] = dial((first_frame + i) / rate_hz), evaluated afresh for each frame; any thread.
  void fill(std::int64_t first_frame, double rate_hz, int frames, double* dials) const noexcept;

 private:
  std::size_t segment(double seconds) const noexcept;
  double on_segment(std::size_t index, double seconds) const noexcept;

  std::vector<TurnPoint> corners_;  // times strictly rising: jumps are already ramps
};

/// A turn and the name of the knob it moves.
struct KnobTurn {
  std::string knob = "volume";
  Turn turn;
};

/// "0:0,8:10" turns the volume knob, "tone=0:10,4:0" the one named. Throws InputError.
KnobTurn parse_knob_turn(std::string_view text, std::string_view where);

}  // namespace unsoldered
