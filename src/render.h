// Renders clips: every hookup at every dial position, or with a knob turning, each as long as the take.
#pragma once

#include <filesystem>
#include <string>
#include <vector>

#include "dsp/hookup.h"
#include "src/clip_format.h"
#include "src/clip_list.h"
#include "src/heard_through.h"
#include "src/progress.h"
#include "src/recorded_through.h"
#include "src/turn.h"

namespace unsoldered {

struct RenderHookup {
  std::filesystem::path file;  // names the clips
  Hookup hookup;
  std::vector<std::filesystem::path> inputs = {};  // what else was read for it; neither is ever overwritten
  std::string name = {};                           // names the clips in the file's place; empty: the file does
  std::optional<double> dial = {};                 // its own position, in place of the request's dials
};

struct RenderRequest {
  std::string take;  // a file, or "built-in"
  std::vector<RenderHookup> hookups;
  std::vector<double> dials;                        // used when no knob turns
  std::vector<KnobTurn> turns;                      // each of another knob
  std::optional<RecordedThrough> recorded_through;  // empty: nothing, the take is the emf
  double boost_limit_db = kUsualBoostLimitDb;
  std::string heard_through = "nothing";  // as --heard-through has it
  std::filesystem::path folder;
  ClipFormat format;
  bool measure = false;         // true peak and loudness in the list, also where nothing needs them
  bool match_loudness = false;  // the hookups at each dial position brought to one loudness
  int jobs = 1;
  bool force = false;
};

struct RenderResult {
  std::vector<ClipRow> clips;         // hookup by hookup, in the order asked for
  std::vector<std::string> messages;  // what the user should know
};

/// Writes the clips and clips.csv: all of them or none. The result does not depend on `jobs`. In integer formats a set
/// whose loudest clip would pass -1 dBFS sample peak, in lossy ones -1 dBTP, is lowered by one common gain. Refuses a
/// take that the format cannot hold before anything is rendered.
/// Throws InputError, CannotError, Interrupted; then nothing is left behind.
RenderResult render(const RenderRequest& request, Progress& progress);

}  // namespace unsoldered
