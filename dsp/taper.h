// The law of a pot's element: which share of the resistance lies below the wiper at each share of the electrical
// travel.
//
// x: electrical travel, 0 = counter-clockwise end (bottom lug), 1 = clockwise end (top lug).
// r: resistance share below the wiper, end resistance left out.
#pragma once

#include <memory>
#include <string>
#include <string_view>
#include <vector>

namespace unsoldered {

/// One corner of a law: electrical travel and resistance share, both 0..1.
struct TaperPoint {
  double x = 0;
  double r = 0;
};

/// A law; a value that is cheap to copy and safe to evaluate in the audio callback (no allocation, no throw).
/// Making one allocates, and so does letting go of the last copy: both belong to the setup thread.
class Taper {
 public:
  /// Linear.
  Taper();
  Taper(const Taper&) = default;
  Taper& operator=(const Taper&) = default;
  // Moving copies: a law that was moved from must still have something to evaluate.
  Taper(Taper&& other) noexcept : law_(other.law_) {}
  Taper& operator=(Taper&& other) noexcept {
    law_ = other.law_;
    return *this;
  }
  ~Taper() = default;

  /// Straight sections through `points`, which start at (0,0), end at (1,1), rise in x and never fall in r. Throws
  /// InputError.
  static Taper sections(std::vector<TaperPoint> points);

  /// Two straight sections through `through`; 0 < x < 1, 0 <= r <= 1. Throws InputError.
  static Taper two_sections(TaperPoint through);

  /// Exponential law r = (b^x - 1)/(b - 1), b = ((1-m)/m)^2, through (0.5, mid_share). 0 < mid_share < 1. Throws
  /// InputError.
  static Taper exponential(double mid_share);

  /// The law r = (b^x - 1)/(b - 1) whose b takes it through `through`; 0.001 <= x, r <= 0.999. Throws InputError when
  /// no b between e^-700 and e^700 does.
  static Taper exponential_through(TaperPoint through);

  /// 1 - r(1 - x) of `law`.
  static Taper reversed(const Taper& law);

  /// Monotone cubic interpolation (adds no wiggle) through measured points, same demands as `sections`. Slopes at the
  /// points: weighted harmonic mean of the neighbouring secants, F. N. Fritsch and J. Butland, SIAM J. Sci. Stat.
  /// Comput. 5 (1984) 300-304; at the two ends the three-point formula of C. Moler, Numerical Computing with MATLAB,
  /// chapter 3 (both from memory; the tests compare with scipy's PchipInterpolator, which cites them). Not smooth in
  /// the second derivative.
  static Taper measured(std::vector<TaperPoint> points);

  /// The same law under another name, as `name()` gives it.
  Taper named(std::string name) const;

  /// r at x; x outside 0..1 is held at the ends, and so is a NaN (at 0). Any thread.
  double share(double x) const noexcept;

  /// As it would be written in a hookup file ("audio 15%").
  const std::string& name() const noexcept;

 private:
  struct Law;
  explicit Taper(std::shared_ptr<const Law> law);
  std::shared_ptr<const Law> law_;
};

/// "linear", "audio 15%", "ideal audio 15%", "reverse audio 15%", "ideal reverse audio 15%" (N from 1 to 49, decimals
/// too). A bare letter ("A", "B", "A500K") is not guessed at: the InputError says that conventions disagree and asks
/// for the law by name or for the ohmmeter reading at half travel. Throws InputError for anything else.
Taper parse_taper(std::string_view text);

/// True for a marking that gives the law by a letter only: "A", "B25k", "A500K", "500kA", "15A". Ohmmeter readings
/// override it.
bool is_taper_letter(std::string_view text);

}  // namespace unsoldered
