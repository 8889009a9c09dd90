// What was rendered: the rows of clips.csv.
#pragma once

#include <optional>
#include <string>
#include <vector>

namespace unsoldered {

struct ClipRow {
  std::string file;            // relative to the folder of the clips
  std::string hookup;          // the hookup file's name without folder and endings
  std::optional<double> dial;  // empty: the knob turned, written as "turn"
  double gain_db = 0;          // sum of all gains applied
  double peak_dbfs = 0;        // sample peak as written; -infinity for digital silence
};

/// Header and one line a clip: file,hookup,dial,gain_db,peak_dbfs,peak_dbtp,loudness_lufs. Not measured: empty.
std::string clips_csv(const std::vector<ClipRow>& clips);

/// An array of objects with the same names. Not measured, and the level of silence: null.
std::string clips_json(const std::vector<ClipRow>& clips);

}  // namespace unsoldered
