#include "dsp/taper.h"

#include <algorithm>
#include <array>
#include <charconv>
#include <cmath>
#include <utility>
#include <variant>

#include "dsp/error.h"
#include "dsp/quantity.h"

namespace unsoldered {
namespace {

constexpr std::string_view kNames =
    "\"linear\", \"audio N%\", \"ideal audio N%\", \"reverse audio N%\", \"ideal reverse audio N%\" (N from 1 to 49)";

constexpr double kLeastStep =
    1e-9;  // of travel between corners; a real element has none closer, and no slope overflows

struct Sections {
  std::vector<TaperPoint> points;
};

/// r = (b^x - 1)/(b - 1)
struct Exponential {
  double log_b = 0;
};

struct MonotoneCubic {
  std::vector<TaperPoint> points;
  std::vector<double> slopes;
};

std::string decimal(double value) {
  std::array<char, 32> buffer{};
  const auto written = std::to_chars(buffer.data(), buffer.data() + buffer.size(), value);
  return {buffer.data(), written.ptr};
}

/// 0.15 as "15%", to twelve figures: 1 - 0.93 is 7 %, not 6.99999999999999 %.
std::string percent(double share) {
  std::array<char, 32> buffer{};
  const auto written =
      std::to_chars(buffer.data(), buffer.data() + buffer.size(), 100 * share, std::chars_format::general, 12);
  return std::string(buffer.data(), written.ptr) + "%";
}

std::string sections_name(const std::vector<TaperPoint>& points) {
  std::string name = "{ sections = [";
  for (std::size_t i = 0; i < points.size(); ++i) {
    name += (i == 0 ? "[" : ", [") + decimal(points[i].x) + ", " + decimal(points[i].r) + "]";
  }
  return name + "] }";
}

void check_points(const std::vector<TaperPoint>& points) {
  const auto refuse = [&](const std::string& why) {
    throw InputError(why +
                     "; a law is a list of [travel, share] corners from [0, 0] to [1, 1], travel rising from corner "
                     "to corner and share never falling");
  };
  if (points.size() < 2) {
    refuse("a law needs at least two corners, here are " + std::to_string(points.size()));
  }
  const auto text = [](const TaperPoint& p) { return "[" + decimal(p.x) + ", " + decimal(p.r) + "]"; };
  for (std::size_t i = 0; i < points.size(); ++i) {
    if (!std::isfinite(points[i].x) || !std::isfinite(points[i].r)) {
      refuse("corner " + text(points[i]) + " is not a number");
    }
    if (i > 0 && !(points[i].x - points[i - 1].x >= kLeastStep)) {
      refuse("travel does not rise from " + text(points[i - 1]) + " to " + text(points[i]));
    }
    if (i > 0 && points[i].r < points[i - 1].r) {
      refuse("share falls from " + text(points[i - 1]) + " to " + text(points[i]));
    }
  }
  if (points.front().x != 0 || points.front().r != 0) {
    refuse("the first corner is " + text(points.front()));
  }
  if (points.back().x != 1 || points.back().r != 1) {
    refuse("the last corner is " + text(points.back()));
  }
}

/// Index of the section that holds x, 0 < x < 1.
std::size_t section_at(const std::vector<TaperPoint>& points, double x) noexcept {
  const auto after =
      std::upper_bound(points.begin(), points.end(), x, [](double value, const TaperPoint& p) { return value < p.x; });
  return static_cast<std::size_t>(after - points.begin()) - 1;
}

double share_at(const Sections& law, double x) noexcept {
  const std::size_t i = section_at(law.points, x);
  const TaperPoint& a = law.points[i];
  const TaperPoint& b = law.points[i + 1];
  return a.r + (b.r - a.r) * ((x - a.x) / (b.x - a.x));
}

/// Written so that neither a very large nor a very small b overflows, and b = 1 is the straight line.
double share_at(const Exponential& law, double x) noexcept {
  const double k = law.log_b;
  if (k == 0) {
    return x;
  }
  if (k < 0) {
    return std::expm1(x * k) / std::expm1(k);
  }
  return std::exp((x - 1) * k) * (std::expm1(-x * k) / std::expm1(-k));
}

double share_at(const MonotoneCubic& law, double x) noexcept {
  const std::size_t i = section_at(law.points, x);
  const TaperPoint& a = law.points[i];
  const TaperPoint& b = law.points[i + 1];
  const double h = b.x - a.x;
  const double t = (x - a.x) / h;
  const double u = 1 - t;
  // Cubic Hermite basis, any numerical analysis text.
  const double value =
      a.r * u * u * (1 + 2 * t) + b.r * t * t * (3 - 2 * t) + h * t * u * (law.slopes[i] * u - law.slopes[i + 1] * t);
  return std::clamp(value, a.r, b.r);  // monotone up to rounding; the clamp takes the rounding too
}

/// Slope at an end from the two nearest sections (widths h0, h1; secants d0, d1), kept from overshooting.
double end_slope(double h0, double h1, double d0, double d1) {
  const double slope = ((2 * h0 + h1) * d0 - h0 * d1) / (h0 + h1);
  if (slope * d0 <= 0) {
    return 0;
  }
  if (d0 * d1 <= 0 && std::fabs(slope) > 3 * std::fabs(d0)) {
    return 3 * d0;
  }
  return slope;
}

std::vector<double> monotone_slopes(const std::vector<TaperPoint>& points) {
  const std::size_t sections = points.size() - 1;
  std::vector<double> widths(sections);
  std::vector<double> secants(sections);
  for (std::size_t i = 0; i < sections; ++i) {
    widths[i] = points[i + 1].x - points[i].x;
    secants[i] = (points[i + 1].r - points[i].r) / widths[i];
  }
  if (sections == 1) {
    return {secants[0], secants[0]};
  }
  std::vector<double> slopes(points.size(), 0.0);
  for (std::size_t i = 1; i < sections; ++i) {
    if (secants[i - 1] > 0 && secants[i] > 0) {
      const double before = 2 * widths[i] + widths[i - 1];
      const double after = widths[i] + 2 * widths[i - 1];
      slopes[i] = (before + after) / (before / secants[i - 1] + after / secants[i]);
    }
  }
  slopes.front() = end_slope(widths[0], widths[1], secants[0], secants[1]);
  slopes.back() = end_slope(widths[sections - 1], widths[sections - 2], secants[sections - 1], secants[sections - 2]);
  return slopes;
}

std::vector<TaperPoint> mirrored(const std::vector<TaperPoint>& points) {
  std::vector<TaperPoint> out;
  out.reserve(points.size());
  for (auto p = points.rbegin(); p != points.rend(); ++p) {
    out.push_back({1 - p->x, 1 - p->r});
  }
  return out;
}

std::string exponential_name(double mid_share) {
  if (mid_share == 0.5) {
    return "linear";
  }
  return mid_share < 0.5 ? "ideal audio " + percent(mid_share) : "ideal reverse audio " + percent(1 - mid_share);
}

/// ln of b = ((1-m)/m)^2
double log_b_for_mid(double mid_share) { return 2 * (std::log1p(-mid_share) - std::log(mid_share)); }

/// Lower case, runs of blanks as one, none at the ends.
std::string normal_form(std::string_view text) {
  std::string out;
  for (char c : text) {
    if (c == ' ' || c == '\t') {
      if (!out.empty() && out.back() != ' ') {
        out += ' ';
      }
    } else {
      out += c >= 'A' && c <= 'Z' ? static_cast<char>(c - 'A' + 'a') : c;
    }
  }
  if (!out.empty() && out.back() == ' ') {
    out.pop_back();
  }
  return out;
}

std::string shown(std::string_view text) {
  std::string out = "\"";
  for (char c : text.substr(0, 64)) {
    const auto code = static_cast<unsigned char>(c);
    out += code < 0x20 || code == 0x7f ? '?' : c;
  }
  return out + "\"";
}

bool take(std::string& text, std::string_view word) {
  if (text.compare(0, word.size(), word) != 0) {
    return false;
  }
  text.erase(0, word.size());
  while (!text.empty() && text.front() == ' ') {
    text.erase(0, 1);
  }
  return true;
}

/// "15%" or "15 %" as 15, from 1 to 49.
double parse_mid_percent(const std::string& text, std::string_view whole) {
  double value = 0;
  const auto read = std::from_chars(text.data(), text.data() + text.size(), value);
  std::string rest(read.ptr, text.data() + text.size());
  if (text.find(',') != std::string::npos) {
    throw InputError(shown(whole) + " has a comma; the decimal sign is a point, as in \"audio 12.5%\"");
  }
  if (read.ec != std::errc() || (rest != "%" && rest != " %")) {
    throw InputError(shown(whole) + " does not end in a percentage; write for instance \"audio 15%\". Accepted are " +
                     std::string(kNames));
  }
  if (!(value >= 1 && value <= 49)) {
    throw InputError(shown(whole) + ": " + decimal(value) +
                     " % at half travel is out of range; accepted is 1 % to 49 %");
  }
  return value;
}

}  // namespace

struct Taper::Law {
  std::variant<Sections, Exponential, MonotoneCubic> shape;
  std::string name;
};

Taper::Taper() : Taper(std::make_shared<const Law>(Law{Exponential{0}, "linear"})) {}

Taper::Taper(std::shared_ptr<const Law> law) : law_(std::move(law)) {}

Taper Taper::sections(std::vector<TaperPoint> points) {
  check_points(points);
  std::string name = sections_name(points);
  return Taper(std::make_shared<const Law>(Law{Sections{std::move(points)}, std::move(name)}));
}

Taper Taper::two_sections(TaperPoint through) { return sections({{0, 0}, through, {1, 1}}); }

Taper Taper::exponential(double mid_share) {
  if (!(mid_share > 0 && mid_share < 1)) {
    throw InputError("share " + decimal(mid_share) +
                     " at half travel is out of range; accepted is above 0 and below 1");
  }
  return Taper(std::make_shared<const Law>(Law{Exponential{log_b_for_mid(mid_share)}, exponential_name(mid_share)}));
}

Taper Taper::exponential_through(TaperPoint through) {
  if (!(through.x >= 0.001 && through.x <= 0.999 && through.r >= 0.001 && through.r <= 0.999)) {
    throw InputError("an exponential law cannot be laid through share " + decimal(through.r) + " at travel " +
                     decimal(through.x) + "; accepted is 0.001 to 0.999 for both");
  }
  if (through.x == 0.5) {
    return exponential(through.r);
  }
  // The share at a fixed x falls as b grows, so halving the interval finds the one b there is.
  double low = -700;
  double high = 700;
  if (share_at(Exponential{low}, through.x) < through.r || share_at(Exponential{high}, through.x) > through.r) {
    throw InputError("no exponential law has share " + decimal(through.r) + " at travel " + decimal(through.x) +
                     "; measure more points and use sections");
  }
  for (int step = 0; step < 100; ++step) {
    const double middle = 0.5 * (low + high);
    (share_at(Exponential{middle}, through.x) > through.r ? low : high) = middle;
  }
  const Exponential law{0.5 * (low + high)};
  return Taper(std::make_shared<const Law>(Law{law, exponential_name(share_at(law, 0.5))}));
}

Taper Taper::measured(std::vector<TaperPoint> points) {
  check_points(points);
  std::vector<double> slopes = monotone_slopes(points);
  return Taper(std::make_shared<const Law>(Law{MonotoneCubic{std::move(points), std::move(slopes)}, "measured"}));
}

Taper Taper::reversed(const Taper& law) {
  const Law& of = *law.law_;
  if (const auto* shape = std::get_if<Sections>(&of.shape)) {
    return sections(mirrored(shape->points));
  }
  if (const auto* shape = std::get_if<MonotoneCubic>(&of.shape)) {
    return measured(mirrored(shape->points)).named("reverse " + of.name);
  }
  // 1 - (b^(1-x) - 1)/(b - 1) is the same law with 1/b.
  const double log_b = -std::get<Exponential>(of.shape).log_b;
  const Exponential shape{log_b == 0 ? 0 : log_b};
  return Taper(std::make_shared<const Law>(Law{shape, exponential_name(share_at(shape, 0.5))}));
}

Taper Taper::named(std::string name) const {
  return Taper(std::make_shared<const Law>(Law{law_->shape, std::move(name)}));
}

double Taper::share(double x) const noexcept {
  if (!(x > 0)) {
    return 0;
  }
  if (x >= 1) {
    return 1;
  }
  if (const auto* shape = std::get_if<Sections>(&law_->shape)) {
    return share_at(*shape, x);
  }
  if (const auto* shape = std::get_if<Exponential>(&law_->shape)) {
    return share_at(*shape, x);
  }
  return share_at(*std::get_if<MonotoneCubic>(&law_->shape), x);
}

const std::string& Taper::name() const noexcept { return law_->name; }

Taper parse_taper(std::string_view text) {
  if (is_taper_letter(text)) {
    throw InputError(
        shown(text) +
        " gives the law by a letter, and conventions disagree: A is audio on most current parts but linear "
        "in older European codes, B the other way round. Write the law by name (" +
        std::string(kNames) +
        "), or measure between the bottom lug and the wiper at half travel and give measured_half");
  }
  std::string rest = normal_form(text);
  if (rest == "linear") {
    return Taper();
  }
  const bool ideal = take(rest, "ideal ");
  const bool reverse = take(rest, "reverse ");
  if (take(rest, "audio")) {
    if (rest.empty()) {
      throw InputError(shown(text) +
                       " does not say how much of the resistance lies below the wiper at half travel; usual are "
                       "\"audio 15%\" (the commonest), \"audio 10%\" and \"audio 20%\" to \"audio 30%\"");
    }
    const double mid_percent = parse_mid_percent(rest, text);
    const double mid = mid_percent / 100;
    Taper law = ideal ? Taper::exponential(mid) : Taper::two_sections({0.5, mid});
    if (reverse) {
      law = Taper::reversed(law);
    }
    return law.named(std::string(ideal ? "ideal " : "") + (reverse ? "reverse " : "") + "audio " +
                     decimal(mid_percent) + "%");
  }
  const bool log_word = rest.rfind("log", 0) == 0 || rest.rfind("antilog", 0) == 0 || rest.rfind("exp", 0) == 0;
  throw InputError(shown(text) + " is not the name of a law; accepted are " + std::string(kNames) +
                   ", { sections = [[0,0], …, [1,1]] } and { measured = \"file.csv\" }" +
                   (log_word ? "; what a catalogue calls log is usually \"audio 15%\" or \"audio 10%\"" : ""));
}

bool is_taper_letter(std::string_view text) {
  constexpr std::string_view letters = "ABCDEFGHMNSTWXYZ";
  std::string code;
  for (char c : text) {
    if (c != ' ' && c != '\t') {
      code += c >= 'a' && c <= 'z' && code.empty() ? static_cast<char>(c - 'a' + 'A') : c;
    }
  }
  if (code.empty()) {
    return false;
  }
  const auto is_value = [](std::string_view value) {
    if (value.empty()) {
      return true;
    }
    try {
      parse_quantity(value, Unit::ohm);
      return true;
    } catch (const InputError&) {
      return false;
    }
  };
  const bool front = letters.find(code.front()) != std::string_view::npos;
  if (code.size() == 1) {
    return front;
  }
  const char last = code.back() >= 'a' && code.back() <= 'z' ? static_cast<char>(code.back() - 'a' + 'A') : code.back();
  const bool back = letters.find(last) != std::string_view::npos;
  return (front && is_value(std::string_view(code).substr(1))) ||
         (back && is_value(std::string_view(code).substr(0, code.size() - 1)));
}

}  // namespace unsoldered
