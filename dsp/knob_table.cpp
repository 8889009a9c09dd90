#include "dsp/knob_table.h"

#include <algorithm>
#include <boost/math/quadrature/gauss_kronrod.hpp>
#include <boost/math/tools/roots.hpp>
#include <cmath>
#include <limits>
#include <numbers>

#include "dsp/hookup_network.h"
#include "dsp/nodal.h"
#include "dsp/state_space.h"

namespace unsoldered {
namespace {

constexpr double reference_hz = 1000;
constexpr double corner_drop_db = 3.0103;
constexpr double corner_top_hz = 1e6;
constexpr double peak_bottom_hz = 20;
constexpr double peak_top_hz = 1e5;
constexpr double room_temperature_k = 293.15;
constexpr int scan_points_a_decade = 40;

double to_db(double power) { return 10 * std::log10(power); }

/// Mean of |H|^2 over log frequency.
double mean_power(CircuitAnalysis& analysis, const Band& band) {
  const double from = std::log(band.from_hz);
  const double to = std::log(band.to_hz);
  const auto power = [&](double log_f) { return std::norm(analysis.value(std::exp(log_f))); };
  return boost::math::quadrature::gauss_kronrod<double, 31>::integrate(power, from, to, 12, 1e-8) / (to - from);
}

double treble_balance_db(CircuitAnalysis& analysis, const Listening& bands) {
  return to_db(mean_power(analysis, bands.treble)) - to_db(mean_power(analysis, bands.body));
}

struct ScanPoint {
  double hz = 0;
  Transfer transfer;
};

/// A frequency scan dense enough that no corner or peak hides between two points: evenly over log f, and round every
/// natural frequency of the network, where a narrow resonance would stand.
std::vector<ScanPoint> scan(CircuitAnalysis& analysis, const std::vector<double>& natural_hz) {
  std::vector<double> hz{peak_bottom_hz, reference_hz, peak_top_hz, corner_top_hz};
  const double decades = std::log10(corner_top_hz / peak_bottom_hz);
  const int count = static_cast<int>(std::ceil(decades * scan_points_a_decade));
  for (int i = 1; i < count; ++i) hz.push_back(peak_bottom_hz * std::pow(10, decades * i / count));
  for (const double natural : natural_hz)
    if (natural > peak_bottom_hz && natural < corner_top_hz) hz.push_back(natural);
  std::sort(hz.begin(), hz.end());
  hz.erase(std::unique(hz.begin(), hz.end()), hz.end());
  std::vector<ScanPoint> points;
  points.reserve(hz.size());
  for (const double f : hz) points.push_back({f, analysis.transfer(f)});
  return points;
}

/// Root of `function` between two frequencies where it changes sign, to double precision on the logarithm.
template <typename Function>
double root_hz(const Function& function, double low_hz, double high_hz) {
  std::uintmax_t iterations = 100;
  const auto bracket =
      boost::math::tools::toms748_solve([&](double log_f) { return function(std::exp(log_f)); }, std::log(low_hz),
                                        std::log(high_hz), boost::math::tools::eps_tolerance<double>(46), iterations);
  return std::exp((bracket.first + bracket.second) / 2);
}

void find_corner(CircuitAnalysis& analysis, const std::vector<ScanPoint>& points, KnobRow& row) {
  const auto above = [&](const Transfer& transfer) { return transfer.level_db() - row.level_db + corner_drop_db; };
  for (std::size_t i = 1; i < points.size(); ++i) {
    if (points[i - 1].hz < reference_hz || above(points[i].transfer) > 0) continue;
    row.corner_hz = root_hz([&](double hz) { return above(analysis.transfer(hz)); }, points[i - 1].hz, points[i].hz);
    return;
  }
}

void find_peak(CircuitAnalysis& analysis, const std::vector<ScanPoint>& points, KnobRow& row) {
  for (std::size_t i = 1; i < points.size() && points[i].hz <= peak_top_hz; ++i) {
    if (!(points[i - 1].transfer.slope() > 0 && points[i].transfer.slope() <= 0)) continue;
    const double hz = points[i].transfer.slope() == 0 ? points[i].hz
                                                      : root_hz([&](double f) { return analysis.transfer(f).slope(); },
                                                                points[i - 1].hz, points[i].hz);
    const double db = analysis.transfer(hz).level_db();
    if (hz >= peak_top_hz || (row.peak_db && db <= *row.peak_db)) continue;
    row.peak_hz = hz;
    row.peak_db = db;
  }
}

}  // namespace

std::vector<double> even_dials(int steps) {
  std::vector<double> dials;
  dials.reserve(static_cast<std::size_t>(steps));
  for (int i = 0; i < steps; ++i) dials.push_back(10.0 * i / (steps - 1));
  return dials;
}

std::vector<KnobRow> knob_table(const Hookup& hookup, const std::vector<double>& dials, const Knob& knob) {
  const Listening bands = listening_bands(hookup);
  const auto circuit_at = [&](double dial) {
    Hookup turned = hookup;
    set_dial(turned, knob, dial);
    return hookup_circuit(turned);
  };
  CircuitAnalysis open(circuit_at(10));
  const double full_balance_db = treble_balance_db(open, bands);

  std::vector<KnobRow> rows;
  rows.reserve(dials.size());
  for (const double dial : dials) {
    const Circuit circuit = circuit_at(dial);
    const PotPlace place = pots_of(circuit, knob).front();
    const PotInNetwork& pot = circuit.stages[place.stage].pots[place.pot];
    CircuitAnalysis analysis(circuit);
    NodalAnalysis looking_back(without_load(circuit));
    KnobRow row;
    row.dial = dial;
    row.degrees = degrees(pot.pot, dial);
    row.element_fraction = fraction_below(pot, dial);
    row.level_db = analysis.transfer(reference_hz).level_db();
    row.output_ohm = std::abs(looking_back.impedance(reference_hz));
    row.noise_uv = 1e6 * johnson_noise_v(analysis, 20, 20000, room_temperature_k);
    if (std::isfinite(row.level_db)) {
      const double balance_db = treble_balance_db(analysis, bands);
      if (std::isfinite(full_balance_db) && std::isfinite(balance_db))
        row.treble_lost_db = full_balance_db - balance_db;
      row.treble_5k_1k_db = to_db(std::norm(analysis.value(5000))) - row.level_db;
      const std::vector<ScanPoint> points = scan(analysis, natural_frequencies_hz(circuit));
      find_corner(analysis, points, row);
      find_peak(analysis, points, row);
    }
    rows.push_back(row);
  }
  return rows;
}

}  // namespace unsoldered
