// Component values as the trade writes them: 500k, 4k7, 2M2, 0.022uF, 22n, 470 pF, 2.4 H, 18 ft.
//
// Accepted: IEC 60062 letter-and-digit code (letter in place of the decimal point), SI prefixes with
// or without the unit, a bare number (ohm, farad, henry, metre …). K = k, u = µ (both code points),
// M = mega, m = milli. The decimal comma is refused with a hint.
#pragma once

#include <string>
#include <string_view>

namespace unsoldered {

enum class Unit { ohm, farad, henry, metre, hertz };

/// Both ends are accepted.
struct Range {
  double low = 0;
  double high = 0;
};

/// The value of `text` in the base unit (ohm, farad, henry, metre, hertz).
/// Throws InputError that quotes the text and says what is accepted.
double parse_quantity(std::string_view text, Unit unit);

/// As `parse_quantity`, and refuses what lies outside `range` with the range in the message.
double parse_quantity(std::string_view text, Unit unit, Range range);

/// Refuses a number outside `range` (or not finite); returns it otherwise.
double require_in_range(double value, Unit unit, Range range);

/// Shortest trade spelling that reads back as the same value: "500k", "4.7k", "22 nF", "470 pF", "2.4 H", "5 m".
std::string format_quantity(double value, Unit unit);

/// "20%" or "20 %" as 0.2. Accepts 0 to 100 %. Throws InputError.
double parse_percent(std::string_view text);

}  // namespace unsoldered
