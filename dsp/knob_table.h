// The loaded taper: what the whole hookup does at every position of its volume knob.
#pragma once

#include <optional>
#include <vector>

#include "dsp/hookup.h"

namespace unsoldered {

/// One row of the knob table. Levels are re the emf. What does not exist is empty; no signal is -infinity.
struct KnobRow {
  double dial = 0;
  double degrees = 0;
  double element_fraction = 0;            // RB/RT, end resistance included
  double level_db = 0;                    // at 1 kHz
  std::optional<double> treble_lost_db;   // T(10) - T(dial); positive is duller than the same hookup at 10
  std::optional<double> treble_5k_1k_db;  // level at 5 kHz minus level at 1 kHz
  std::optional<double> corner_hz;        // lowest above 1 kHz, up to 1 MHz, 3.0103 dB below the level at 1 kHz
  std::optional<double> peak_hz;          // highest local maximum inside 20 Hz..100 kHz
  std::optional<double> peak_db;
  double output_ohm = 0;  // |Z| at 1 kHz into `output`, cable and load removed
  double noise_uv = 0;    // Johnson noise at the grid, 20 Hz..20 kHz, 293.15 K
};

/// Rows at the given dials (0..10). T = mean power in the treble band minus mean power in the body band, in dB,
/// averaged over log frequency; bands from listening_bands(). Of any knob the hookup has, every other at its own dial.
/// Throws InputError when there is no solution.
std::vector<KnobRow> knob_table(const Hookup& hookup, const std::vector<double>& dials,
                                const Knob& knob = Knob::volume);

/// `steps` dials from 0 to 10, evenly spaced; steps >= 2.
std::vector<double> even_dials(int steps);

}  // namespace unsoldered
