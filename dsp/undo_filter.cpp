#include "dsp/undo_filter.h"

#include <algorithm>
#include <cmath>
#include <complex>
#include <utility>

namespace unsoldered {
namespace {

constexpr double kFloor = 1e-6;  // -120 dB re emf, to which the program vouches for responses
constexpr double kLowFrom = 6;   // Hz, W is one from here
constexpr double kLowNothing = 1;
constexpr double kNearlyDc = 1e-4;     // Hz, stands for 0
constexpr double kVanishesHz = 1e-6;   // where H_rec is looked at to see whether it goes to nothing
constexpr int kPointsPerOctave = 128;  // a resonance of Q 10 between two points: 0.01 dB

/// 1 / H_rec with the floor and, when asked for, the fade towards 0 Hz.
class Inverse {
 public:
  Inverse(const Response& recorded, bool fades) : recorded_(&recorded), fades_(fades) {}

  std::complex<double> operator()(double hz) const {
    if (fades_ && hz <= kLowNothing) return 0;
    const std::complex<double> through = (*recorded_)(std::max(hz, kNearlyDc));
    const double low = fades_ ? smooth_step((hz - kLowNothing) / (kLowFrom - kLowNothing)) : 1;
    if (std::abs(through) < kFloor) return low * std::conj(through) / (kFloor * kFloor);
    return low / through;
  }

 private:
  const Response* recorded_;
  bool fades_;
};

std::vector<double> marks(double rate_hz) {
  const double top = rate_hz / 2;
  const int count = static_cast<int>(std::ceil(kPointsPerOctave * std::log2(top / kUndoLowestHz)));
  std::vector<double> hz;
  for (int i = 0; i <= count; ++i) hz.push_back(kUndoLowestHz * std::pow(top / kUndoLowestHz, double(i) / count));
  return hz;
}

/// Where `excess` (positive inside) is positive, its edges found between the marks.
template <typename Excess>
std::vector<Band> bands_where(const std::vector<double>& hz, const std::vector<double>& at_marks, double top,
                              const Excess& excess) {
  const auto edge = [&](double outside, double inside) {
    for (int i = 0; i < 40; ++i) {
      const double middle = std::sqrt(outside * inside);
      (excess(middle) > 0 ? inside : outside) = middle;
    }
    return inside;
  };
  std::vector<Band> bands;
  for (std::size_t i = 0; i < hz.size(); ++i) {
    const bool here = at_marks[i] > 0;
    const bool before = i > 0 && at_marks[i - 1] > 0;
    if (here && !before) bands.push_back({i == 0 ? hz[0] : edge(hz[i - 1], hz[i]), hz.back()});
    if (!here && before) bands.back().to_hz = edge(hz[i], hz[i - 1]);
  }
  for (Band& band : bands) band.to_hz = std::min(band.to_hz, top);
  std::erase_if(bands, [&](const Band& band) { return band.from_hz >= top; });
  return bands;
}

/// The limiter L, from the worst boost over the limit in dB at the marks; in between a cubic over log frequency, whose
/// corners do not ring. Under kRumbleHz it never rises towards 0 Hz: a peak that narrow would ring for seconds.
class Limiter {
 public:
  Limiter(const std::vector<double>& hz, std::vector<double> excess_db)
      : lowest_hz_(hz.front()), octaves_(std::log2(hz.back() / hz.front())), excess_db_(std::move(excess_db)) {
    for (double& one : excess_db_) one = std::max(one, kSilentDb);
    const auto rumble = static_cast<std::size_t>(place(kRumbleHz));
    for (std::size_t i = std::min(rumble, excess_db_.size() - 1); i-- > 0;)
      excess_db_[i] = std::max(excess_db_[i], std::min(excess_db_[i + 1], kMostDb));
  }

  double operator()(double hz) const {
    const double position = place(hz);
    const auto last = excess_db_.size() - 1;
    const auto below = std::min(static_cast<std::size_t>(position), last - 1);
    const double x = position - static_cast<double>(below);
    const double p0 = excess_db_[below == 0 ? 0 : below - 1];
    const double p1 = excess_db_[below];
    const double p2 = excess_db_[below + 1];
    const double p3 = excess_db_[std::min(below + 2, last)];
    if (!(p1 > 0) && !(p2 > 0)) return 1;
    // Catmull and Rom's cubic through the four.
    const double excess = p1 + x / 2 * (p2 - p0 + x * (2 * p0 - 5 * p1 + 4 * p2 - p3 + x * (3 * (p1 - p2) + p3 - p0)));
    return std::pow(10, -std::max(0.0, excess) / 20);
  }

 private:
  static constexpr double kRumbleHz = 10;
  static constexpr double kSilentDb = -400;
  static constexpr double kMostDb = 400;

  double place(double hz) const {
    const double octave = std::log2(std::max(hz, lowest_hz_) / lowest_hz_);
    return std::min(octave / octaves_, 1.0) * static_cast<double>(excess_db_.size() - 1);
  }

  double lowest_hz_;
  double octaves_;
  std::vector<double> excess_db_;
};

}  // namespace

std::optional<UndoFilter> design_undo_filter(const Response& recorded, const std::vector<Response>& played,
                                             double limit_db, double rate_hz) {
  const std::vector<double> hz = marks(rate_hz);
  const double top = pass_band_hz(rate_hz);
  UndoFilter undo;

  const auto under_floor = [&](double f) { return kFloor - std::abs(recorded(f)); };
  std::vector<double> at_marks;
  bool anything = false;
  for (const double f : hz) {
    at_marks.push_back(under_floor(f));
    anything = anything || (f <= top && at_marks.back() <= 0);
  }
  if (!anything) return std::nullopt;
  undo.beyond_reach = bands_where(hz, at_marks, top, under_floor);

  const bool vanishes = std::abs(recorded(kVanishesHz)) < 0.01 * std::abs(recorded(kLowFrom));
  const auto design = [&](bool fades) {
    const Inverse inverse(recorded, fades);
    const auto excess_db = [&](double f) {
      double worst = 0;
      for (const Response& one : played) worst = std::max(worst, std::abs(one(f)));
      return 20 * std::log10(worst * std::abs(inverse(f))) - limit_db;  // minus infinity: no signal, no boost
    };
    for (std::size_t i = 0; i < hz.size(); ++i) at_marks[i] = excess_db(hz[i]);
    const Limiter limiter(hz, at_marks);
    undo.limited = bands_where(hz, at_marks, top, excess_db);
    const SampledFir sampled = sample_response(
        [&](double f) {
          const double fade = upper_fade(f, rate_hz);
          return fade == 0 ? 0.0 : fade * limiter(f) * inverse(f);
        },
        rate_hz);
    undo.fir = sampled.fir;
    undo.settled = sampled.settled;
    undo.from_hz = fades ? std::optional(kLowFrom) : std::nullopt;
  };
  design(vanishes);
  if (!undo.settled && !vanishes) design(true);
  return undo;
}

}  // namespace unsoldered
