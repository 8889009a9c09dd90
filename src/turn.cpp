#include "src/turn.h"

#include <algorithm>
#include <utility>

#include "dsp/error.h"
#include "src/dial_list.h"
#include "src/number_text.h"

namespace unsoldered {
namespace {

constexpr double kJumpSeconds = 0.005;
constexpr double kLongestSeconds = 1e6;  // eleven days: a slip of the pen, not a turn

std::string at_time(std::string_view where, double seconds) {
  return std::string(where) + ": the point at " + format_number(seconds) + " s ";
}

void check_times(const std::vector<TurnPoint>& points, std::string_view where) {
  if (points.empty()) throw InputError(std::string(where) + ": no points; write seconds:dial, such as 0:0,8:10");
  for (std::size_t i = 0; i < points.size(); ++i) {
    const double now = points[i].seconds;
    if (!(now >= 0 && now <= kLongestSeconds)) {
      throw InputError(at_time(where, now) + "is out of range; times are seconds from the start of the take, 0 to " +
                       format_number(kLongestSeconds) + " s");
    }
    if (!(points[i].dial >= 0 && points[i].dial <= 10)) {
      throw InputError(at_time(where, now) + "has dial " + format_number(points[i].dial) +
                       ", off the scale; a knob goes from 0 to 10, so give a number in that range");
    }
    if (i == 0) continue;
    const double before = points[i - 1].seconds;
    if (now < before) {
      throw InputError(at_time(where, now) + "comes after the one at " + format_number(before) +
                       " s; write the points in the order of their times");
    }
    if (i < 2 || before > points[i - 2].seconds) continue;
    if (now == before) {
      throw InputError(
          at_time(where, now) +
          "is the third at that time; at most two are accepted, which make a jump of 5 ms; move it to a later time");
    }
    if (now <= before + kJumpSeconds) {
      throw InputError(at_time(where, now) + "falls into the jump at " + format_number(before) +
                       " s, which takes 5 ms; move it to after " + format_number(before + kJumpSeconds) + " s");
    }
  }
}

}  // namespace

Turn::Turn(std::vector<TurnPoint> points, std::string_view where) : corners_(std::move(points)) {
  check_times(corners_, where);
  for (std::size_t i = 1; i < corners_.size(); ++i) {
    if (corners_[i].seconds == corners_[i - 1].seconds) corners_[i].seconds += kJumpSeconds;
  }
}

Turn Turn::parse(std::string_view text, std::string_view where) {
  if (text.find(';') != std::string_view::npos) {
    throw InputError(std::string(where) + ": \"" + std::string(text) +
                     "\" has a semicolon; write points seconds:dial with a comma between them, such as 0:0,8:10");
  }
  std::vector<TurnPoint> points;
  for (std::string_view rest = text;;) {
    const auto comma = rest.find(',');
    const auto point = trimmed(rest.substr(0, comma));
    const auto colon = point.find(':');
    const auto seconds = colon == std::string_view::npos ? std::nullopt : parse_number(point.substr(0, colon));
    if (!seconds) {
      throw InputError(std::string(where) + ": \"" + std::string(point) + "\" in \"" + std::string(text) +
                       "\" is not a point; write seconds:dial, points separated by commas, such as 0:0,8:10");
    }
    points.push_back(
        {*seconds, parse_dial(point.substr(colon + 1), std::string(where) + ": point \"" + std::string(point) +
                                                           "\" in \"" + std::string(text) + "\"")});
    if (comma == std::string_view::npos) break;
    rest.remove_prefix(comma + 1);
  }
  return {std::move(points), where};
}

std::size_t Turn::segment(double seconds) const noexcept {
  const auto after = std::upper_bound(corners_.begin(), corners_.end(), seconds,
                                      [](double time, const TurnPoint& corner) { return time < corner.seconds; });
  return after == corners_.begin() ? 0 : static_cast<std::size_t>(after - corners_.begin()) - 1;
}

double Turn::on_segment(std::size_t index, double seconds) const noexcept {
  const TurnPoint& from = corners_[index];
  if (seconds <= from.seconds || index + 1 == corners_.size()) return from.dial;
  const TurnPoint& to = corners_[index + 1];
  const double share = (seconds - from.seconds) / (to.seconds - from.seconds);
  return std::clamp(from.dial + share * (to.dial - from.dial), 0.0, 10.0);
}

double Turn::dial(double seconds) const noexcept { return on_segment(segment(seconds), seconds); }

void Turn::fill(std::int64_t first_frame, double rate_hz, int frames, double* dials) const noexcept {
  std::size_t index = segment(static_cast<double>(first_frame) / rate_hz);
  for (int i = 0; i < frames; ++i) {
    const double seconds = static_cast<double>(first_frame + i) / rate_hz;
    while (index + 1 < corners_.size() && seconds >= corners_[index + 1].seconds) ++index;
    dials[i] = on_segment(index, seconds);
  }
}

KnobTurn parse_knob_turn(std::string_view text, std::string_view where) {
  const auto equals = text.find('=');
  if (equals == std::string_view::npos) return {"volume", Turn::parse(text, where)};
  const auto knob = trimmed(text.substr(0, equals));
  if (knob.empty()) {
    throw InputError(std::string(where) + ": \"" + std::string(text) +
                     "\" names no knob before the equals sign; write tone=0:10,4:0, or 0:0,8:10 for the volume knob");
  }
  return {std::string(knob), Turn::parse(text.substr(equals + 1), std::string(where) + " " + std::string(knob))};
}

}  // namespace unsoldered
