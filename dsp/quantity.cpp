#include "dsp/quantity.h"

#include <algorithm>
#include <array>
#include <charconv>
#include <cmath>
#include <optional>
#include <utility>

#include "dsp/error.h"

namespace unsoldered {
namespace {

constexpr std::size_t kLongestText = 64;
constexpr double kMetresPerFoot = 0.3048;  // exact: international yard and pound agreement, 1959
constexpr double kMetresPerInch = 0.0254;  // exact: the same

/// A spelling that may follow the number, with its power of ten.
struct Prefix {
  std::string_view text;
  int power;
};

constexpr std::array<Prefix, 14> kPrefixes = {{
    {"Meg", 6},  // longest first
    {"meg", 6},
    {"MEG", 6},
    {"p", -12},
    {"n", -9},
    {"u", -6},
    {"\xC2\xB5", -6},  // U+00B5 micro sign
    {"\xCE\xBC", -6},  // U+03BC Greek small letter mu
    {"m", -3},
    {"k", 3},
    {"K", 3},
    {"M", 6},
    {"G", 9},
    {"T", 12},
}};

/// What is known about one unit: words for messages, spellings, and the powers of ten in use with it.
struct UnitTraits {
  std::string_view quantity;  // "a resistance"
  std::string_view base;      // "ohm"
  std::string_view examples;
  std::array<std::string_view, 6> spellings;  // unused entries are empty
  int lowest_power;
  int highest_power;
  char code_letter;  // stands for the decimal point (IEC 60062 and by analogy); 0: none
};

constexpr std::array<Unit, 5> kUnits = {Unit::ohm, Unit::farad, Unit::henry, Unit::metre, Unit::hertz};

UnitTraits traits_of(Unit unit) {
  switch (unit) {
    case Unit::ohm:
      return {"a resistance",
              "ohm",
              "500k, 4k7, 2M2, 470R, 100 ohm or a bare number in ohm",
              {"ohm", "ohms", "Ohm", "Ohms", "\xCE\xA9", "\xE2\x84\xA6"},
              -6,
              12,
              'R'};
    case Unit::farad:
      return {"a capacitance",
              "farad",
              "22n, 4n7, 470 pF, 0.022uF or a bare number in farad",
              {"F", "farad", "farads", "", "", ""},
              -12,
              -3,
              'F'};
    case Unit::henry:
      return {"an inductance",
              "henry",
              "2.4 H, 2H5, 350 mH or a bare number in henry",
              {"H", "henry", "henries", "", "", ""},
              -9,
              3,
              'H'};
    case Unit::metre:
      return {"a length",
              "metre",
              "5 m, 18 ft, 30 cm or a bare number in metre",
              {"m", "metre", "metres", "meter", "meters", ""},
              0,
              0,
              '\0'};
    case Unit::hertz:
      break;
  }
  return {"a frequency",
          "hertz",
          "200 Hz, 5k, 2.5 kHz or a bare number in hertz",
          {"Hz", "hz", "HZ", "hertz", "", ""},
          -3,
          9,
          '\0'};
}

bool is_digit(char c) { return c >= '0' && c <= '9'; }

/// Control characters are shown as '?', so that a message cannot drive the terminal; overlong text is cut.
std::string shown(std::string_view text) {
  std::string out = "\"";
  for (char c : text.substr(0, kLongestText)) {
    const auto code = static_cast<unsigned char>(c);
    out += code < 0x20 || code == 0x7f ? '?' : c;
  }
  return out + (text.size() > kLongestText ? "\xE2\x80\xA6\"" : "\"");
}

[[noreturn]] void refuse(std::string_view text, Unit unit, const std::string& why) {
  const UnitTraits traits = traits_of(unit);
  throw InputError(shown(text) + " " + why + "; wanted is " + std::string(traits.quantity) + ": write " +
                   std::string(traits.examples));
}

bool starts_with(std::string_view text, std::string_view start) { return text.substr(0, start.size()) == start; }

/// Drops blanks at the front, the no-break and thin spaces of typeset text among them.
std::string_view skip_space(std::string_view text) {
  constexpr std::array<std::string_view, 6> spaces = {" ", "\t", "\xC2\xA0", "\xE2\x80\xAF", "\xE2\x80\x89", "\r"};
  for (bool found = true; found;) {
    found = false;
    for (std::string_view space : spaces) {
      if (starts_with(text, space)) {
        text.remove_prefix(space.size());
        found = true;
      }
    }
  }
  return text;
}

std::string_view trim(std::string_view text) {
  text = skip_space(text);
  while (!text.empty() && (text.back() == ' ' || text.back() == '\t' || text.back() == '\r')) {
    text.remove_suffix(1);
  }
  return text;
}

/// True when `text` is one of the unit's spellings; behind a small prefix the lower-case "f" of "22nf" is one as well.
bool is_unit_word(std::string_view text, Unit unit, std::optional<int> power) {
  for (std::string_view spelling : traits_of(unit).spellings) {
    if (!spelling.empty() && text == spelling) {
      return true;
    }
  }
  if (unit == Unit::farad && text == "f" && power && *power < -3) {
    return true;  // not "mf", which old schematics use for microfarad
  }
  return false;
}

/// Power of ten of the longest prefix at the front of `text`, which is moved past it.
std::optional<int> take_prefix(std::string_view& text, Unit unit) {
  const UnitTraits traits = traits_of(unit);
  for (const Prefix& prefix : kPrefixes) {
    if (!starts_with(text, prefix.text)) {
      continue;
    }
    const bool meg = prefix.text.size() == 3;
    if (prefix.power < traits.lowest_power || prefix.power > traits.highest_power || (meg && unit != Unit::ohm)) {
      continue;
    }
    text.remove_prefix(prefix.text.size());
    return prefix.power;
  }
  return std::nullopt;
}

/// Unit of a suffix such as "nF" or "kohm" whatever unit is wanted, for the message.
std::optional<Unit> unit_of_suffix(std::string_view suffix) {
  for (Unit unit : kUnits) {
    std::string_view rest = suffix;
    if (is_unit_word(rest, unit, std::nullopt)) {
      return unit;
    }
    const std::optional<int> power = take_prefix(rest, unit);
    if (power && is_unit_word(skip_space(rest), unit, power)) {
      return unit;
    }
  }
  return std::nullopt;
}

/// The decimal number `digits` times ten to the `power`, rounded once.
double scaled(std::string_view digits, int power, std::string_view text, Unit unit) {
  std::string decimal(digits);
  const std::size_t exponent_at = decimal.find_first_of("eE");
  if (exponent_at != std::string::npos) {
    int exponent = 0;
    const std::size_t first = exponent_at + (decimal[exponent_at + 1] == '+' ? 2 : 1);
    const auto read = std::from_chars(decimal.data() + first, decimal.data() + decimal.size(), exponent);
    if (read.ec != std::errc() || exponent > 400 || exponent < -400) {
      refuse(text, unit, "has an exponent no part can have");
    }
    power += exponent;
    decimal.erase(exponent_at);
  }
  decimal += "e" + std::to_string(power);
  double value = 0;
  const auto read = std::from_chars(decimal.data(), decimal.data() + decimal.size(), value);
  if (read.ec != std::errc() || read.ptr != decimal.data() + decimal.size() || !std::isfinite(value)) {
    refuse(text, unit, "is not a number that can be held");
  }
  return value;
}

/// Length of the plain decimal number at the front of `text` (digits, point, exponent); 0 when there is none.
std::size_t number_length(std::string_view text) {
  std::size_t at = 0;
  bool any_digit = false;
  while (at < text.size() && is_digit(text[at])) {
    ++at;
    any_digit = true;
  }
  if (at < text.size() && text[at] == '.') {
    ++at;
    while (at < text.size() && is_digit(text[at])) {
      ++at;
      any_digit = true;
    }
  }
  if (!any_digit) {
    return 0;
  }
  if (at < text.size() && (text[at] == 'e' || text[at] == 'E')) {
    std::size_t exponent = at + 1;
    if (exponent < text.size() && (text[exponent] == '+' || text[exponent] == '-')) {
      ++exponent;
    }
    const std::size_t first_digit = exponent;
    while (exponent < text.size() && is_digit(text[exponent])) {
      ++exponent;
    }
    if (exponent > first_digit) {
      at = exponent;
    }
  }
  return at;
}

/// The code with a letter in place of the decimal point (IEC 60062): "4k7", "R47", "n47", "2H5". Empty when it is not
/// one.
std::optional<double> letter_code(std::string_view text, Unit unit) {
  const UnitTraits traits = traits_of(unit);
  if (unit == Unit::metre) {
    return std::nullopt;
  }
  std::size_t whole = 0;
  while (whole < text.size() && is_digit(text[whole])) {
    ++whole;
  }
  std::string_view rest = text.substr(whole);
  int power = 0;
  if (!rest.empty() && traits.code_letter != '\0' && rest.front() == traits.code_letter) {
    rest.remove_prefix(1);
  } else if (const std::optional<int> prefix = take_prefix(rest, unit)) {
    power = *prefix;
  } else {
    return std::nullopt;
  }
  std::size_t decimals = 0;
  while (decimals < rest.size() && is_digit(rest[decimals])) {
    ++decimals;
  }
  if (decimals == 0) {
    return std::nullopt;
  }
  const std::string_view tail = skip_space(rest.substr(decimals));
  if (!tail.empty() && !is_unit_word(tail, unit, power)) {
    return std::nullopt;
  }
  const std::string digits =
      (whole == 0 ? "0" : std::string(text.substr(0, whole))) + "." + std::string(rest.substr(0, decimals));
  return scaled(digits, power, text, unit);
}

/// Metres per foot or inch.
std::optional<double> length_factor(std::string_view suffix) {
  constexpr std::array<std::pair<std::string_view, double>, 6> factors = {{{"ft", kMetresPerFoot},
                                                                           {"foot", kMetresPerFoot},
                                                                           {"feet", kMetresPerFoot},
                                                                           {"in", kMetresPerInch},
                                                                           {"inch", kMetresPerInch},
                                                                           {"inches", kMetresPerInch}}};
  for (const auto& [name, factor] : factors) {
    if (suffix == name) {
      return factor;
    }
  }
  return std::nullopt;
}

/// "A500k", "B25k", "500kA": a pot's marking with its law letter.
bool carries_law_letter(std::string_view text) {
  constexpr std::string_view letters = "ABCDW";
  if (text.size() < 2) {
    return false;
  }
  const bool front = letters.find(text.front()) != std::string_view::npos && is_digit(text[1]);
  const bool back = letters.find(text.back()) != std::string_view::npos && is_digit(text.front());
  return front || back;
}

/// Why `text`, which is no quantity of this unit, is refused.
/// What a marking of three figures on a capacitor means, " (the marking 223 …)"; empty for anything else. Two figures and a
/// power of ten, in picofarad; a letter after it is the tolerance (IEC 60062).
std::string marking_hint(std::string_view text, Unit unit) {
  const std::string_view code = trim(text);
  const bool letter = code.size() == 4 && code[3] >= 'A' && code[3] <= 'Z';
  if (unit != Unit::farad || (code.size() != 3 && !letter) || !std::all_of(code.begin(), code.begin() + 3, is_digit))
    return {};
  const int power = code[2] == '8' ? -2 : code[2] == '9' ? -1 : code[2] - '0';
  double farad = 0;  // read as text, so that 22e-9 is the number nearest to it
  const std::string figures = std::string(code.substr(0, 2)) + "e" + std::to_string(power - 12);
  std::from_chars(figures.data(), figures.data() + figures.size(), farad);
  if (farad == 0) return {};
  return "; as a marking on a capacitor it is " + format_quantity(farad, Unit::farad) + ": write that";
}

[[noreturn]] void explain(std::string_view whole_text, std::string_view text, std::size_t number, Unit unit) {
  if (text.find(',') != std::string_view::npos) {
    std::string with_point(text);
    for (char& c : with_point) {
      c = c == ',' ? '.' : c;
    }
    refuse(whole_text, unit, "has a comma; the decimal sign is a point, as in \"" + with_point + "\"");
  }
  if (unit == Unit::ohm && carries_law_letter(text)) {
    refuse(whole_text, unit,
           "looks like a marking with a taper letter, and conventions for the letters disagree; write the resistance "
           "without it and the law by name in taper (\"linear\", \"audio 15%\")");
  }
  const std::string_view suffix = skip_space(text.substr(number));
  if (const std::optional<Unit> other = unit_of_suffix(suffix); number > 0 && other && *other != unit) {
    refuse(whole_text, unit,
           "is " + std::string(traits_of(*other).quantity) + " (" + std::string(traits_of(*other).base) + ")");
  }
  if (number == 0) {
    refuse(whole_text, unit, "has no number in front");
  }
  for (const Prefix& prefix : kPrefixes) {
    if (suffix == prefix.text) {
      refuse(whole_text, unit,
             "has the prefix " + std::string(suffix) + ", which is not used here" + marking_hint(whole_text, unit));
    }
  }
  refuse(whole_text, unit,
         "has " + shown(suffix) + " after the number, which means nothing here" + marking_hint(whole_text, unit));
}

/// `digits` with the decimal point `whole` places in; zeros are added on either side as needed.
std::string place_point(const std::string& digits, int whole) {
  const int count = static_cast<int>(digits.size());
  if (whole <= 0) {
    return "0." + std::string(static_cast<std::size_t>(-whole), '0') + digits;
  }
  if (whole >= count) {
    return digits + std::string(static_cast<std::size_t>(whole - count), '0');
  }
  return digits.substr(0, static_cast<std::size_t>(whole)) + "." + digits.substr(static_cast<std::size_t>(whole));
}

/// The engineering prefix in which a value with this decimal exponent (1 <= mantissa < 10) is written.
int power_for(int exponent, Unit unit) {
  if (unit == Unit::metre) {
    return 0;
  }
  const UnitTraits traits = traits_of(unit);
  const int lowest = unit == Unit::ohm || unit == Unit::hertz ? 0 : traits.lowest_power;
  const int highest = unit == Unit::farad || unit == Unit::henry ? 0 : 9;
  int power = 3 * static_cast<int>(std::floor(exponent / 3.0));
  power = power < lowest ? lowest : power;
  return power > highest ? highest : power;
}

std::string_view prefix_text(int power) {
  switch (power) {
    case -12:
      return "p";
    case -9:
      return "n";
    case -6:
      return "u";
    case -3:
      return "m";
    case 3:
      return "k";
    case 6:
      return "M";
    case 9:
      return "G";
    default:
      return "";
  }
}

std::string_view unit_symbol(Unit unit) {
  switch (unit) {
    case Unit::ohm:
      return "ohm";
    case Unit::farad:
      return "F";
    case Unit::henry:
      return "H";
    case Unit::metre:
      return "m";
    case Unit::hertz:
      break;
  }
  return "Hz";
}

}  // namespace

double parse_quantity(std::string_view text, Unit unit) {
  std::string_view rest = trim(text);
  if (rest.empty()) {
    refuse(text, unit, "is empty");
  }
  if (rest.size() > kLongestText) {
    refuse(text, unit, "is too long to be a value");
  }
  if (rest.front() == '-' || starts_with(rest, "\xE2\x88\x92")) {
    refuse(text, unit, "is negative");
  }
  if (rest.front() == '+') {
    rest.remove_prefix(1);
  }
  if (const std::optional<double> code = letter_code(rest, unit)) {
    return *code;
  }
  const std::size_t length = number_length(rest);
  if (length == 0) {
    explain(text, rest, 0, unit);
  }
  const std::string_view number = rest.substr(0, length);
  // "4E7" is 4.7 ohm in some shops and 40 megohm to a calculator; nobody should be surprised by seven decades.
  const std::size_t capital = number.find('E');
  if (unit == Unit::ohm && capital != std::string_view::npos && is_digit(number[capital + 1])) {
    refuse(text, unit, "can be read as 4.7-style code (E for the point) or as a power of ten");
  }
  std::string_view suffix = skip_space(rest.substr(length));
  if (suffix.empty() || is_unit_word(suffix, unit, std::nullopt)) {
    return scaled(number, 0, text, unit);
  }
  if (unit == Unit::ohm && suffix == "R") {
    return scaled(number, 0, text, unit);
  }
  if (unit == Unit::metre) {
    if (suffix == "cm" || suffix == "mm") {
      return scaled(number, suffix == "cm" ? -2 : -3, text, unit);
    }
    if (const std::optional<double> factor = length_factor(suffix)) {
      return scaled(number, 0, text, unit) * *factor;
    }
    explain(text, rest, length, unit);
  }
  std::string_view after_prefix = suffix;
  const std::optional<int> power = take_prefix(after_prefix, unit);
  after_prefix = skip_space(after_prefix);
  if (power && (after_prefix.empty() || is_unit_word(after_prefix, unit, power))) {
    return scaled(number, *power, text, unit);
  }
  explain(text, rest, length, unit);
}

double parse_quantity(std::string_view text, Unit unit, Range range) {
  const double value = parse_quantity(text, unit);
  if (!(value >= range.low && value <= range.high)) {
    throw InputError(
        shown(text) + " (" + format_quantity(value, unit) + ") is out of range; accepted is " +
        format_quantity(range.low, unit) + " to " + format_quantity(range.high, unit) +
        (marking_hint(text, unit).empty() ? "; check the figure and its prefix" : marking_hint(text, unit)));
  }
  return value;
}

double require_in_range(double value, Unit unit, Range range) {
  if (!(value >= range.low && value <= range.high)) {
    throw InputError(format_quantity(value, unit) + " is out of range; accepted is " +
                     format_quantity(range.low, unit) + " to " + format_quantity(range.high, unit) +
                     (value >= 100 && value < 1000 ? marking_hint(std::to_string(std::lround(value)), unit) : ""));
  }
  return value;
}

std::string format_quantity(double value, Unit unit) {
  const std::string symbol(unit_symbol(unit));
  if (!std::isfinite(value)) {
    return (std::isnan(value) ? "nan " : value < 0 ? "-inf " : "inf ") + symbol;
  }
  if (value == 0) {
    return "0 " + symbol;
  }
  std::array<char, 32> buffer{};
  const auto written =
      std::to_chars(buffer.data(), buffer.data() + buffer.size(), std::fabs(value), std::chars_format::scientific);
  const std::string scientific(buffer.data(), written.ptr);
  const std::size_t exponent_at = scientific.find('e');
  const int exponent = std::stoi(scientific.substr(exponent_at + 1));
  std::string digits = scientific.substr(0, exponent_at);
  if (digits.size() > 1) {
    digits.erase(1, 1);
  }
  const std::string sign = value < 0 ? "-" : "";
  const int power = power_for(exponent, unit);
  const int whole = exponent - power + 1;
  if (whole > 15 || whole < -9) {
    return sign + scientific + " " + symbol;  // far outside any part: the plain scientific form stays readable
  }
  const std::string number = sign + place_point(digits, whole);
  if (unit == Unit::ohm && power > 0) {
    return number + std::string(prefix_text(power));
  }
  return number + " " + std::string(prefix_text(power)) + symbol;
}

double parse_percent(std::string_view text) {
  const auto refuse_percent = [&](const std::string& why) {
    throw InputError(shown(text) + " " + why + "; accepted is 0% to 100%, written as \"20%\"");
  };
  std::string_view rest = trim(text);
  if (rest.find(',') != std::string_view::npos) {
    refuse_percent("has a comma; the decimal sign is a point");
  }
  const std::size_t length = number_length(rest);
  if (length == 0 || trim(rest.substr(length)) != "%") {
    refuse_percent("is not a percentage");
  }
  double percent = 0;
  const auto read = std::from_chars(rest.data(), rest.data() + length, percent);
  if (read.ec != std::errc() || !(percent <= 100)) {
    refuse_percent("is out of range");
  }
  return percent / 100;
}

}  // namespace unsoldered
