// Renders clips: every hookup at every dial position, or with a knob turning, each as long as the take.
#pragma once

#include <filesystem>
#include <optional>
#include <string>
#include <vector>

#include "dsp/hookup.h"
#include "src/clip_list.h"
#include "src/clip_writer.h"
#include "src/progress.h"
#include "src/turn.h"

namespace unsoldered {

struct RenderHookup {
  std::filesystem::path file;  // names the clips
  Hookup hookup;
  std::vector<std::filesystem::path> inputs = {};  // what else was read for it; neither is ever overwritten
};

struct RenderRequest {
  std::string take;  // a file, or "built-in"
  std::vector<RenderHookup> hookups;
  std::vector<double> dials;  // used when no knob turns
  std::optional<KnobTurn> turn;
  std::filesystem::path folder;
  Depth depth = Depth::pcm24;
  int jobs = 1;
  bool force = false;
};

struct RenderResult {
  std::vector<ClipRow> clips;         // hookup by hookup, in the order asked for
  std::vector<std::string> messages;  // what the user should know
};

/// Writes the clips and clips.csv: all of them or none. The result does not depend on `jobs`. In integer formats a set
/// whose loudest clip would pass -1 dBFS sample peak is lowered by one common gain.
/// Throws InputError, CannotError, Interrupted; then nothing is left behind.
RenderResult render(const RenderRequest& request, Progress& progress);

}  // namespace unsoldered
