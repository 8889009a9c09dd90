// Quantities: what the trade writes is read exactly, what it does not write is refused with a way on.
#include "dsp/quantity.h"

#include <cmath>
#include <limits>
#include <random>
#include <string>
#include <vector>

#include "dsp/error.h"
#include "tests/catch.h"

using Catch::Matchers::ContainsSubstring;
using unsoldered::format_quantity;
using unsoldered::InputError;
using unsoldered::parse_percent;
using unsoldered::parse_quantity;
using unsoldered::Unit;

namespace {

struct Row {
  std::string text;
  double value;
};

void check_rows(const std::vector<Row>& rows, Unit unit) {
  for (const Row& row : rows) {
    CAPTURE(row.text);
    CHECK(parse_quantity(row.text, unit) == row.value);
  }
}

void check_refused(const std::vector<std::string>& texts, Unit unit) {
  for (const std::string& text : texts) {
    CAPTURE(text);
    CHECK_THROWS_AS(parse_quantity(text, unit), InputError);
  }
}

}  // namespace

TEST_CASE("Resistor and capacitor codes of IEC 60062 read exactly") {
  // The code as in IEC 60062, from memory; exact.
  check_rows({{"R47", 0.47},
              {"4R7", 4.7},
              {"470R", 470},
              {"4k7", 4700},
              {"4K7", 4700},
              {"47k", 47000},
              {"250k", 250000},
              {"500k", 500000},
              {"1M0", 1e6},
              {"1M", 1e6},
              {"2M2", 2.2e6},
              {"10M", 10e6},
              {"1G0", 1e9}},
             Unit::ohm);
  check_rows({{"p47", 0.47e-12},
              {"4p7", 4.7e-12},
              {"470p", 470e-12},
              {"1n0", 1e-9},
              {"1n", 1e-9},
              {"1n2", 1.2e-9},
              {"47n", 47e-9},
              {"n47", 470e-12},
              {"470n", 470e-9},
              {"u47", 0.47e-6},
              {"\xC2\xB5"
               "47",
               0.47e-6},
              {"\xCE\xBC"
               "47",
               0.47e-6},
              {"4u7", 4.7e-6}},
             Unit::farad);
  check_rows({{"2H5", 2.5}}, Unit::henry);  // by analogy, not in the standard
}

TEST_CASE("Units and prefixes read as they are written at the bench") {
  check_rows({{"4.7 kohm", 4700},
              {"4.7k ohm", 4700},
              {"4.7 k\xCE\xA9", 4700},
              {"4.7k\xE2\x84\xA6", 4700},
              {"100 ohm", 100},
              {"100 ohms", 100},
              {"1 Meg", 1e6},
              {"1meg", 1e6},
              {"50", 50},
              {" 50 ", 50},
              {"+50", 50},
              {".5", 0.5},
              {"1e6", 1e6},
              {"1.5e+3 ohm", 1500},
              {"5m", 0.005},
              {"0", 0}},
             Unit::ohm);
  check_rows({{"0.022uF", 0.022e-6},
              {"0.022 \xC2\xB5"
               "F",
               0.022e-6},
              {"470 pF", 470e-12},
              {"470pf", 470e-12},
              {"22n", 22e-9},
              {"22nF", 22e-9},
              {"4n7F", 4.7e-9},
              {"1 mF", 1e-3},
              {"22e-9", 22e-9},
              {"470\xC2\xA0pF", 470e-12}},
             Unit::farad);
  check_rows({{"2.4 H", 2.4}, {"350 mH", 0.35}, {"2.4", 2.4}, {"47uH", 47e-6}}, Unit::henry);
  check_rows({{"5 m", 5}, {"18 ft", 18 * 0.3048}, {"30 cm", 0.3}, {"5", 5}, {"12 inches", 12 * 0.0254}}, Unit::metre);
  check_rows({{"200 Hz", 200}, {"5k", 5000}, {"2k5", 2500}, {"2.5 kHz", 2500}, {"1 MHz", 1e6}}, Unit::hertz);
}

TEST_CASE("M is mega and m is milli") {
  CHECK(parse_quantity("2M2", Unit::ohm) == 2.2e6);
  CHECK(parse_quantity("2m2", Unit::ohm) == 2.2e-3);
}

TEST_CASE("What is no value of the unit is refused") {
  check_refused({"",
                 " ",
                 "5 F",
                 "22n",
                 "470p",
                 "2.4 H",
                 "5 Hz",
                 "4,7k",
                 "-5k",
                 "\xE2\x88\x92"
                 "5k",
                 "inf",
                 "nan",
                 "infinity",
                 "1e999",
                 "1e-999",
                 "4k7x",
                 "4.7k7",
                 "4 k 7",
                 "1 000",
                 "k",
                 "R",
                 "ohm",
                 ".",
                 "5k5k",
                 "0x10",
                 "470E",
                 "4E7",
                 "5 parsec",
                 "--5",
                 "++5",
                 "5\n6",
                 "1e",
                 "\xFF"},
                Unit::ohm);
  check_refused({"500k", "1M", "0.02 mf", "4R7", "2.4 H", "22f"}, Unit::farad);
  check_refused({"22 nF", "5 ft", "4k7 ohm", "2R4"}, Unit::henry);
  check_refused({"100 pF", "5 M", "5m5", "5 k", "18\""}, Unit::metre);
  check_refused({std::string(100000, '9'), std::string(100, '0') + "k"}, Unit::ohm);
}

TEST_CASE("A refusal quotes the text and says what is accepted") {
  CHECK_THROWS_WITH(parse_quantity("5 F", Unit::ohm),
                    ContainsSubstring("\"5 F\"") && ContainsSubstring("capacitance") && ContainsSubstring("500k"));
  CHECK_THROWS_WITH(parse_quantity("22n", Unit::ohm), ContainsSubstring("\"22n\"") && ContainsSubstring("prefix n"));
  CHECK_THROWS_WITH(parse_quantity("4,7k", Unit::ohm), ContainsSubstring("comma") && ContainsSubstring("4.7k"));
  CHECK_THROWS_WITH(parse_quantity("-3", Unit::farad), ContainsSubstring("negative"));
  CHECK_THROWS_WITH(parse_quantity("A500k", Unit::ohm), ContainsSubstring("taper letter"));
  CHECK_THROWS_WITH(parse_quantity("500kA", Unit::ohm), ContainsSubstring("taper letter"));
  CHECK_THROWS_WITH(parse_quantity("", Unit::henry), ContainsSubstring("empty") && ContainsSubstring("2.4 H"));
  CHECK_THROWS_WITH(parse_quantity("1\x1b[31m", Unit::ohm), !ContainsSubstring("\x1b"));
}

TEST_CASE("A value outside the range is refused with the range") {
  CHECK(parse_quantity("500k", Unit::ohm, {10, 100e6}) == 500e3);
  CHECK(parse_quantity("10", Unit::ohm, {10, 100e6}) == 10);
  CHECK_THROWS_WITH(parse_quantity("0", Unit::ohm, {10, 100e6}),
                    ContainsSubstring("10 ohm") && ContainsSubstring("100M"));
  CHECK_THROWS_WITH(parse_quantity("22 F", Unit::farad, {0.01e-12, 10e-3}),
                    ContainsSubstring("22 F") && ContainsSubstring("0.01 pF") && ContainsSubstring("10 mF"));
  const double nan = std::numeric_limits<double>::quiet_NaN();
  const double inf = std::numeric_limits<double>::infinity();
  for (double value : {nan, inf, -inf, -1.0, 9.0}) {
    CHECK_THROWS_AS(unsoldered::require_in_range(value, Unit::ohm, {10, 100}), InputError);
  }
  CHECK(unsoldered::require_in_range(10, Unit::ohm, {10, 100}) == 10);
}

TEST_CASE("Values are written as the trade writes them") {
  CHECK(format_quantity(500e3, Unit::ohm) == "500k");
  CHECK(format_quantity(4700, Unit::ohm) == "4.7k");
  CHECK(format_quantity(2.2e6, Unit::ohm) == "2.2M");
  CHECK(format_quantity(470, Unit::ohm) == "470 ohm");
  CHECK(format_quantity(0.47, Unit::ohm) == "0.47 ohm");
  CHECK(format_quantity(0, Unit::ohm) == "0 ohm");
  CHECK(format_quantity(22e-9, Unit::farad) == "22 nF");
  CHECK(format_quantity(470e-12, Unit::farad) == "470 pF");
  CHECK(format_quantity(1e-6, Unit::farad) == "1 uF");
  CHECK(format_quantity(2.4, Unit::henry) == "2.4 H");
  CHECK(format_quantity(5, Unit::metre) == "5 m");
  CHECK(format_quantity(5.4864, Unit::metre) == "5.4864 m");
  CHECK(format_quantity(2000, Unit::hertz) == "2 kHz");
}

TEST_CASE("What is written reads back as the same number") {
  std::mt19937_64 random(20261201);
  std::uniform_real_distribution<double> exponent(-13, 11);
  std::uniform_real_distribution<double> mantissa(1, 10);
  for (int i = 0; i < 20000; ++i) {
    const double value = mantissa(random) * std::pow(10.0, exponent(random));
    for (Unit unit : {Unit::ohm, Unit::farad, Unit::henry, Unit::metre, Unit::hertz}) {
      const std::string text = format_quantity(value, unit);
      CAPTURE(text, value);
      REQUIRE(parse_quantity(text, unit) == value);
    }
  }
}

TEST_CASE("Random text never does anything but read or be refused") {
  std::mt19937 random(7);
  const std::string alphabet = "0123456789.,+-eEkKMmGRrunpFHzf \xC2\xB5\xCE\xBC\xA9";
  std::uniform_int_distribution<std::size_t> letter(0, alphabet.size() - 1);
  std::uniform_int_distribution<int> length(0, 8);
  int read = 0;
  for (int i = 0; i < 100000; ++i) {
    std::string text;
    for (int n = length(random); n > 0; --n) {
      text += alphabet[letter(random)];
    }
    try {
      const double value = parse_quantity(text, Unit::farad);
      ++read;
      if (!(std::isfinite(value) && value >= 0)) {
        FAIL("read " << text << " as " << value);
      }
    } catch (const InputError&) {
    }
  }
  CHECK(read > 1000);
}

TEST_CASE("Percentages need their sign") {
  CHECK(parse_percent("20%") == 0.2);
  CHECK(parse_percent("20 %") == 0.2);
  CHECK(parse_percent("0%") == 0);
  CHECK(parse_percent("100%") == 1);
  CHECK(parse_percent("0.5%") == 0.005);
  for (const char* text : {"20", "0.2", "-5%", "101%", "nan%", "", "%", "5%%", "1,5%", "inf%"}) {
    CAPTURE(text);
    CHECK_THROWS_AS(parse_percent(text), InputError);
  }
}

TEST_CASE("A capacitor's three-figure marking is not taken for a value, and the message says what it means") {
  // Two figures and a power of ten in picofarad (common practice), 9 and 8 for tenths and hundredths; letters: IEC 60062.
  const unsoldered::Range range{0.01e-12, 10e-3};
  const auto refusal = [&](const char* text) {
    try {
      parse_quantity(text, Unit::farad, range);
    } catch (const InputError& error) {
      return std::string(error.what());
    }
    return std::string("accepted");
  };
  CHECK_THAT(refusal("223"), ContainsSubstring("22 nF"));
  CHECK_THAT(refusal("223J"), ContainsSubstring("22 nF"));
  CHECK_THAT(refusal("104K"), ContainsSubstring("100 nF"));
  CHECK_THAT(refusal("229"), ContainsSubstring("2.2 pF"));
  CHECK_THAT(refusal("22"), !ContainsSubstring("marking"));
}
