// What was rendered: the rows of clips.csv.
#pragma once

#include <optional>
#include <string>
#include <vector>

#include "src/table_text.h"

namespace unsoldered {

struct ClipRow {
  std::string file;                          // relative to the folder of the clips
  std::string hookup;                        // the hookup file's name without folder and endings
  std::optional<double> dial;                // empty: the knob turned, written as "turn"
  double gain_db = 0;                        // sum of all gains applied
  double peak_dbfs = 0;                      // sample peak as written; -infinity for digital silence
  std::optional<double> peak_dbtp = {};      // peak between the samples; empty: not measured
  std::optional<double> loudness_lufs = {};  // integrated; -infinity when nothing is above the gate
};

/// Columns file, hookup, dial, gain_db, peak_dbfs, peak_dbtp, loudness_lufs; what was not measured is empty.
Table clip_table(const std::vector<ClipRow>& clips);

}  // namespace unsoldered
