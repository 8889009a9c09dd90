// Tapers: the laws against the published table of their values, names read and refused, and no wiggle in a measured
// law.
#include "dsp/taper.h"

#include <cmath>
#include <limits>
#include <random>
#include <string>
#include <vector>

#include "dsp/error.h"
#include "tests/catch.h"

using Catch::Matchers::ContainsSubstring;
using Catch::Matchers::WithinAbs;
using unsoldered::InputError;
using unsoldered::parse_taper;
using unsoldered::Taper;
using unsoldered::TaperPoint;

namespace {

double db(double share) { return 20 * std::log10(share); }

struct Corner {
  double share;
  double level_db;
};

struct LawRow {
  double mid;
  double b;
  Corner exponential[4];  // at 0.10, 0.25, 0.75, 0.90
  Corner two_line[4];
};

// Calculated from r = (b^x - 1)/(b - 1), b = ((1-m)/m)^2, and from slopes 2m and 2(1-m) (algebra; evaluated with
// scipy).
const std::vector<LawRow> kLaws = {
    {0.05,
     361.00000,
     {{0.00223, -53.043}, {0.00933, -40.602}, {0.22728, -12.869}, {0.55371, -5.134}},
     {{0.01000, -40.000}, {0.02500, -32.041}, {0.52500, -5.597}, {0.81000, -1.830}}},
    {0.10,
     81.00000,
     {{0.00690, -43.225}, {0.02500, -32.041}, {0.32500, -9.762}, {0.63995, -3.877}},
     {{0.02000, -33.979}, {0.05000, -26.021}, {0.55000, -5.193}, {0.82000, -1.724}}},
    {0.13,
     44.78698,
     {{0.01056, -39.523}, {0.03624, -28.816}, {0.37255, -8.576}, {0.67651, -3.395}},
     {{0.02600, -31.701}, {0.06500, -23.742}, {0.56500, -4.959}, {0.82600, -1.660}}},
    {0.15,
     32.11111,
     {{0.01333, -37.504}, {0.04437, -27.058}, {0.40144, -7.928}, {0.69744, -3.130}},
     {{0.03000, -30.458}, {0.07500, -22.499}, {0.57500, -4.807}, {0.83000, -1.618}}},
    {0.20,
     16.00000,
     {{0.02130, -33.432}, {0.06667, -23.522}, {0.46667, -6.620}, {0.74172, -2.595}},
     {{0.04000, -27.959}, {0.10000, -20.000}, {0.60000, -4.437}, {0.84000, -1.514}}},
    {0.25,
     9.00000,
     {{0.03072, -30.253}, {0.09151, -20.771}, {0.52452, -5.605}, {0.77808, -2.179}},
     {{0.05000, -26.021}, {0.12500, -18.062}, {0.62500, -4.082}, {0.85000, -1.412}}},
    {0.30,
     5.44444,
     {{0.04155, -27.629}, {0.11869, -18.511}, {0.57695, -4.777}, {0.80905, -1.841}},
     {{0.06000, -24.437}, {0.15000, -16.478}, {0.65000, -3.742}, {0.86000, -1.310}}},
};

const double kTravels[4] = {0.10, 0.25, 0.75, 0.90};

std::vector<TaperPoint> random_points(std::mt19937& random) {
  std::uniform_int_distribution<int> count(0, 8);
  std::uniform_real_distribution<double> step(0.001, 1);
  std::bernoulli_distribution flat(0.25);
  std::vector<TaperPoint> points = {{0, 0}};
  for (int n = count(random); n >= 0; --n) {
    points.push_back({points.back().x + step(random), points.back().r + (flat(random) ? 0.0 : step(random))});
  }
  points.push_back({points.back().x + step(random), points.back().r + step(random)});
  const TaperPoint last = points.back();
  for (TaperPoint& point : points) {
    point = {point.x / last.x, point.r / last.r};
  }
  return points;
}

}  // namespace

TEST_CASE("Named laws have the table's values at a tenth, a quarter, three quarters and nine tenths") {
  for (const LawRow& row : kLaws) {
    const std::string percent = std::to_string(static_cast<int>(std::lround(100 * row.mid))) + "%";
    const Taper ideal = parse_taper("ideal audio " + percent);
    const Taper audio = parse_taper("audio " + percent);
    const Taper ideal_reverse = parse_taper("ideal reverse audio " + percent);
    const Taper reverse = parse_taper("reverse audio " + percent);
    for (int i = 0; i < 4; ++i) {
      const double x = kTravels[i];
      CAPTURE(percent, x);
      // Tolerances of the table: share 1e-5, level 0.001 dB.
      CHECK_THAT(ideal.share(x), WithinAbs(row.exponential[i].share, 1e-5));
      CHECK_THAT(db(ideal.share(x)), WithinAbs(row.exponential[i].level_db, 0.001));
      CHECK_THAT(audio.share(x), WithinAbs(row.two_line[i].share, 1e-5));
      CHECK_THAT(db(audio.share(x)), WithinAbs(row.two_line[i].level_db, 0.001));
      CHECK_THAT(ideal_reverse.share(1 - x), WithinAbs(1 - row.exponential[i].share, 1e-5));
      CHECK_THAT(reverse.share(1 - x), WithinAbs(1 - row.two_line[i].share, 1e-5));
    }
    CHECK_THAT((std::pow((1 - row.mid) / row.mid, 2)), WithinAbs(row.b, 1e-5));
    CHECK_THAT(ideal.share(0.5), WithinAbs(row.mid, 1e-15));
    CHECK_THAT(audio.share(0.5), WithinAbs(row.mid, 1e-15));
  }
}

TEST_CASE("Level at half travel of the usual laws, unloaded") {
  // Percentages and letters as in the JIS-style code, from memory; the levels are 20 log10 of them.
  CHECK_THAT(db(parse_taper("linear").share(0.5)), WithinAbs(-6.0206, 0.0001));
  CHECK_THAT(db(parse_taper("audio 15%").share(0.5)), WithinAbs(-16.4782, 0.0001));
  CHECK_THAT(db(parse_taper("audio 10%").share(0.5)), WithinAbs(-20.0000, 0.0001));
  CHECK_THAT(db(parse_taper("audio 20%").share(0.5)), WithinAbs(-13.9794, 0.0001));
  CHECK_THAT(db(parse_taper("audio 30%").share(0.5)), WithinAbs(-10.4576, 0.0001));
  CHECK_THAT(db(parse_taper("reverse audio 15%").share(0.5)), WithinAbs(-1.4116, 0.0001));
  CHECK_THAT(db(parse_taper("reverse audio 10%").share(0.5)), WithinAbs(-0.9151, 0.0001));
}

TEST_CASE("Three straight sections have the values worked out by hand") {
  const Taper law = Taper::sections({{0, 0}, {0.3, 0.03}, {0.6, 0.2}, {1, 1}});
  // Constructed vector, 1e-6.
  CHECK_THAT(law.share(0.15), WithinAbs(0.015, 1e-6));
  CHECK_THAT(law.share(0.45), WithinAbs(0.115, 1e-6));
  CHECK_THAT(law.share(0.5), WithinAbs(0.143333, 1e-6));
  CHECK_THAT(law.share(0.8), WithinAbs(0.6, 1e-6));
  CHECK_THAT(db(law.share(0.15)), WithinAbs(-36.4782, 1e-4));
  CHECK_THAT(db(law.share(0.8)), WithinAbs(-4.4370, 1e-4));
}

TEST_CASE(
    "A linear element with a resistor from wiper to ground follows x/(1 + k x(1-x)) with this taper's linear share") {
  // The arrangement is described in Self, Small Signal Audio Design (from memory); values calculated from the formula.
  const double k = 10;  // 100k element, 10k resistor
  const Taper linear;
  const auto share = [&](double travel) {
    const double x = linear.share(travel);
    return x / (1 + k * x * (1 - x));
  };
  CHECK_THAT(db(share(0.25)), WithinAbs(-21.214, 0.001));
  CHECK_THAT(db(share(0.5)), WithinAbs(-16.902, 0.001));
  CHECK_THAT(db(share(0.75)), WithinAbs(-11.672, 0.001));
}

TEST_CASE("Every law runs from 0 to 1, never falls and is held outside") {
  std::mt19937 random(3);
  std::vector<Taper> laws = {Taper(),
                             parse_taper("audio 1%"),
                             parse_taper("audio 49%"),
                             parse_taper("ideal audio 1%"),
                             parse_taper("ideal reverse audio 1%"),
                             Taper::exponential(1e-300),
                             Taper::exponential(1 - 1e-16),
                             Taper::exponential(0.5),
                             Taper::exponential_through({0.4, 0.02})};
  for (int i = 0; i < 200; ++i) {
    laws.push_back(Taper::sections(random_points(random)));
    laws.push_back(Taper::measured(random_points(random)));
    laws.push_back(Taper::reversed(laws.back()));
  }
  for (const Taper& law : laws) {
    CAPTURE(law.name());
    REQUIRE(law.share(0) == 0);
    REQUIRE(law.share(1) == 1);
    REQUIRE(law.share(-3) == 0);
    REQUIRE(law.share(7) == 1);
    REQUIRE(law.share(std::numeric_limits<double>::quiet_NaN()) == 0);
    double before = 0;
    for (int n = 0; n <= 2000; ++n) {
      const double now = law.share(n / 2000.0);
      if (!(now >= before - 1e-15 && now <= 1)) {
        FAIL("share falls or leaves 0..1 at " << n / 2000.0);
      }
      before = now;
    }
  }
}

TEST_CASE("Turning a law round twice gives it back") {
  std::mt19937 random(4);
  std::vector<Taper> laws = {Taper(), Taper::exponential(0.1), Taper::two_sections({0.4, 0.1})};
  laws.push_back(Taper::measured(random_points(random)));
  for (const Taper& law : laws) {
    const Taper once = Taper::reversed(law);
    const Taper twice = Taper::reversed(once);
    for (double x : {0.01, 0.2, 0.37, 0.5, 0.77, 0.99}) {
      CHECK_THAT(once.share(1 - x), WithinAbs(1 - law.share(x), 1e-14));
      CHECK_THAT(twice.share(x), WithinAbs(law.share(x), 1e-14));
    }
  }
}

TEST_CASE("The measured law agrees with scipy's monotone interpolation") {
  struct Reference {
    std::vector<TaperPoint> points;
    std::vector<TaperPoint> values;
  };
  // scipy 1.10.1, scipy.interpolate.PchipInterpolator(x, r)(at)
  const std::vector<Reference> references = {{{{0, 0}, {0.2, 0.02}, {0.5, 0.12}, {0.8, 0.6}, {1, 1}},
                                              {{0.05, 0.001920173267},
                                               {0.1, 0.006453795380},
                                               {0.3, 0.040266049593},
                                               {0.35, 0.054879651758},
                                               {0.6, 0.229164522217},
                                               {0.7, 0.408214101904},
                                               {0.9, 0.790776119403},
                                               {0.97, 0.935732746269}}},
                                             {{{0, 0}, {0.5, 0.1}, {1, 1}},
                                              {{0.05, 0.00118},
                                               {0.1, 0.00464},
                                               {0.3, 0.03888},
                                               {0.35, 0.05194},
                                               {0.6, 0.17504},
                                               {0.7, 0.31792},
                                               {0.97, 0.92235712}}},
                                             {{{0, 0}, {0.1, 0}, {0.45, 0.3}, {0.9, 1}, {1, 1}},
                                              {{0.05, 0},
                                               {0.3, 0.128434026451},
                                               {0.35, 0.184805852383},
                                               {0.6, 0.554287548654},
                                               {0.7, 0.762023698591},
                                               {0.97, 1}}}};
  for (const Reference& reference : references) {
    const Taper law = Taper::measured(reference.points);
    for (const TaperPoint& value : reference.values) {
      CAPTURE(value.x);
      CHECK_THAT(law.share(value.x), WithinAbs(value.r, 1e-11));
    }
    for (const TaperPoint& point : reference.points) {
      CHECK_THAT(law.share(point.x), WithinAbs(point.r, 1e-15));
    }
  }
  CHECK_THAT(Taper::measured({{0, 0}, {1, 1}}).share(0.3), WithinAbs(0.3, 1e-15));
}

TEST_CASE("An exponential law is laid through any point") {
  for (const TaperPoint& point :
       std::vector<TaperPoint>{{0.5, 0.15}, {0.4, 0.05}, {0.6, 0.55}, {0.45, 0.9}, {0.3, 0.3}}) {
    CAPTURE(point.x, point.r);
    CHECK_THAT(Taper::exponential_through(point).share(point.x), WithinAbs(point.r, 1e-12));
  }
  CHECK_THROWS_AS(Taper::exponential_through({0.5, 0}), InputError);
  CHECK_THROWS_AS(Taper::exponential_through({1, 0.5}), InputError);
  CHECK_THROWS_AS(Taper::exponential_through({0.999, 0.001}), InputError);
}

TEST_CASE("Corners that are no law are refused") {
  const double nan = std::numeric_limits<double>::quiet_NaN();
  const std::vector<std::vector<TaperPoint>> wrong = {{},
                                                      {{0, 0}},
                                                      {{0, 0}, {0.5, 0.5}},
                                                      {{0.1, 0}, {1, 1}},
                                                      {{0, 0.1}, {1, 1}},
                                                      {{0, 0}, {1, 0.9}},
                                                      {{0, 0}, {0.6, 0.5}, {0.4, 0.6}, {1, 1}},
                                                      {{0, 0}, {0.4, 0.6}, {0.5, 0.5}, {1, 1}},
                                                      {{0, 0}, {0.5, 0.2}, {0.5, 0.3}, {1, 1}},
                                                      {{0, 0}, {nan, 0.5}, {1, 1}},
                                                      {{0, 0}, {0.5, nan}, {1, 1}}};
  for (const std::vector<TaperPoint>& points : wrong) {
    CHECK_THROWS_AS(Taper::sections(points), InputError);
    CHECK_THROWS_AS(Taper::measured(points), InputError);
  }
  CHECK_THROWS_AS(Taper::exponential(0), InputError);
  CHECK_THROWS_AS(Taper::exponential(1), InputError);
  CHECK_THROWS_AS(Taper::exponential(nan), InputError);
  CHECK_THROWS_WITH(Taper::sections({{0, 0}, {0.4, 0.6}, {0.5, 0.5}, {1, 1}}),
                    ContainsSubstring("share falls from [0.4, 0.6]"));
}

TEST_CASE("Names are kept, whatever blanks and capitals they came with") {
  CHECK(parse_taper("linear").name() == "linear");
  CHECK(parse_taper("  Linear ").name() == "linear");
  CHECK(parse_taper("audio 15%").name() == "audio 15%");
  CHECK(parse_taper("Audio  15 %").name() == "audio 15%");
  CHECK(parse_taper("audio15%").name() == "audio 15%");
  CHECK(parse_taper("ideal audio 12.5%").name() == "ideal audio 12.5%");
  CHECK(parse_taper("reverse audio 10%").name() == "reverse audio 10%");
  CHECK(parse_taper("ideal reverse audio 7%").name() == "ideal reverse audio 7%");
  CHECK(Taper::exponential(0.15).name() == "ideal audio 15%");
  CHECK(Taper::exponential(0.93).name() == "ideal reverse audio 7%");
  CHECK(Taper::reversed(Taper()).name() == "linear");
  CHECK(Taper::two_sections({0.5, 0.15}).name() == "{ sections = [[0, 0], [0.5, 0.15], [1, 1]] }");
}

TEST_CASE("A law given by a letter is not guessed at") {
  for (const char* text : {"A", "B", "C", "a", "D", "W", "A500K", "B25k", "500kA", "A 500k", "15A", "10C", "4B"}) {
    CAPTURE(text);
    CHECK(unsoldered::is_taper_letter(text));
    CHECK_THROWS_WITH(parse_taper(text), ContainsSubstring("conventions disagree") &&
                                             ContainsSubstring("\"audio N%\"") && ContainsSubstring("measured_half"));
  }
  for (const char* text : {"linear", "audio 15%", "ideal audio 15%", "log", "", "500k"}) {
    CAPTURE(text);
    CHECK_FALSE(unsoldered::is_taper_letter(text));
  }
}

TEST_CASE("Names that are no law are refused with those that are") {
  for (const char* text : {"", "log", "log 15%", "antilog", "audio 15", "audio %", "audio x%", "audio -5%", "audio 1e",
                           "lin", "reverse", "ideal", "ideal linear", "reverse linear", "audio ideal 15%",
                           "audio 15% x", "audio nan%", "MN", "audio 15%%"}) {
    CAPTURE(text);
    CHECK_THROWS_WITH(parse_taper(text), ContainsSubstring("\"linear\"") || ContainsSubstring("1 % to 49 %"));
  }
  CHECK_THROWS_WITH(parse_taper("audio"), ContainsSubstring("\"audio 15%\"") && ContainsSubstring("\"audio 10%\""));
  CHECK_THROWS_WITH(parse_taper("log 15%"), ContainsSubstring("\"log 15%\"") && ContainsSubstring("\"linear\""));
  CHECK_THROWS_WITH(parse_taper("audio 0.5%"), ContainsSubstring("1 % to 49 %"));
  CHECK_THROWS_WITH(parse_taper("audio 50%"), ContainsSubstring("1 % to 49 %"));
  CHECK_THROWS_WITH(parse_taper("audio 12,5%"), ContainsSubstring("comma"));
}

TEST_CASE("A copy is the same law, and outlives what it was copied from") {
  Taper copy;
  {
    const Taper law = parse_taper("ideal audio 10%");
    copy = law;
  }
  CHECK_THAT(copy.share(0.5), WithinAbs(0.1, 1e-15));
  const Taper moved = std::move(copy);
  CHECK_THAT(copy.share(0.5), WithinAbs(moved.share(0.5), 0));
}
