// unsoldered render TAKE --hookup F … [--dial 10,7,3 | --turn "0:0,8:10"] --out DIR
#include <algorithm>
#include <cstdio>
#include <iostream>
#include <memory>
#include <optional>
#include <string>
#include <thread>
#include <vector>

#include "dsp/error.h"
#include "src/count_option.h"
#include "src/dial_list.h"
#include "src/hookup_file.h"
#include "src/progress.h"
#include "src/render.h"
#include "src/verb.h"

namespace unsoldered {
namespace {

constexpr int kMostJobs = 256;

struct RenderOptions {
  std::string take;
  std::vector<std::string> hookups;
  std::vector<std::string> dials;
  std::vector<std::string> turns;
  std::vector<std::string> settings;
  std::string folder;
  std::string format = "wav";
  std::string depth = "24";
  std::optional<std::string> jobs;
  bool force = false;
  bool json = false;
};

std::vector<double> dials_of(const RenderOptions& options) {
  if (options.dials.empty()) return {10.0};
  std::vector<double> dials;
  for (const std::string& text : options.dials) {
    for (const double dial : parse_dials(text, "--dial")) dials.push_back(dial);
  }
  return dials;
}

std::optional<KnobTurn> turn_of(const RenderOptions& options) {
  if (options.turns.empty()) return std::nullopt;
  if (!options.dials.empty()) {
    throw InputError("--dial and --turn: a clip has the knob held or turning; give one of the two");
  }
  const KnobTurn turn = parse_knob_turn(options.turns.front(), "--turn");
  for (std::size_t i = 1; i < options.turns.size(); ++i) {
    const KnobTurn other = parse_knob_turn(options.turns[i], "--turn");
    if (other.knob == turn.knob) {
      throw InputError("--turn: the " + turn.knob + " knob is given two turns; write all its points in one");
    }
    throw InputError(
        "--turn: the " + turn.knob + " knob and the " + other.knob +
        " knob cannot turn in one clip; turn one, and set the other with --set, such as --set tone.dial=4");
  }
  return turn;
}

int jobs_of(const RenderOptions& options) {
  if (options.jobs) return parse_count(*options.jobs, "--jobs", 1, kMostJobs);
  return std::clamp(static_cast<int>(std::thread::hardware_concurrency()), 1, kMostJobs);
}

void run(const RenderOptions& options) {
  if (options.format != "wav") {
    throw InputError("--format: \"" + options.format + "\" is not a format of clips; give wav");
  }
  RenderRequest request;
  request.take = options.take;
  request.depth = parse_depth(options.depth, "--depth");
  request.turn = turn_of(options);
  request.dials = dials_of(options);
  request.folder = options.folder;
  request.jobs = jobs_of(options);
  request.force = options.force;
  for (const std::string& file : options.hookups) {
    request.hookups.push_back({file, read_hookup(file, options.settings), files_of_hookup(file, options.settings)});
  }

  RenderResult result;
  {
    Progress progress("rendering", stderr);
    result = render(request, progress);
  }
  for (const std::string& message : result.messages) std::cerr << "unsoldered render: " << message << '\n';
  print_table(clip_table(result.clips), options.json);
}

}  // namespace

void add_render_verb(CLI::App& app, VerbAction& action) {
  const auto options = std::make_shared<RenderOptions>();
  CLI::App* verb = app.add_subcommand(
      "render", "Plays a take through hookups and writes clips, one for every hookup and knob position");
  verb->add_option("TAKE", options->take, "WAV or FLAC file, or the word built-in for a phrase of plucked strings")
      ->required();
  verb->add_option("--hookup", options->hookups, "Hookup files; may be repeated")->required()->type_name("FILE");
  verb->add_option("--dial", options->dials, "Volume knob positions 0 to 10, a clip for each (default 10)")
      ->allow_extra_args(false)
      ->type_name("10,7,3");
  verb->add_option("--turn", options->turns,
                   "The knob turns instead: points seconds:dial joined by straight lines,\n"
                   "held before the first and after the last; two points at one time are\n"
                   "a ramp of 5 ms. tone=0:10,4:0 turns the tone knob")
      ->allow_extra_args(false)
      ->type_name("0:0,8:10");
  verb->add_option("--out", options->folder, "Folder for the clips and clips.csv; made if missing")
      ->required()
      ->type_name("FOLDER");
  verb->add_option("--set", options->settings,
                   "Overrides a value in every hookup, such as tone.dial=4; may be repeated")
      ->allow_extra_args(false)
      ->type_name("KEY=VALUE");
  verb->add_option("--format", options->format, "File format: wav")->type_name("wav");
  verb->add_option("--depth", options->depth, "Bits a sample: 16 (dithered), 24 or float")
      ->type_name("16|24|float")
      ->capture_default_str();
  verb->add_option("--jobs", options->jobs, "Clips rendered at one time, 1 to 256 (default: one a processor core)")
      ->type_name("N");
  verb->add_flag("--force", options->force, "Replaces clips that are already there");
  verb->add_flag("--json", options->json, "The list of clips on standard output as JSON instead of CSV");
  verb->footer(
      "Examples (in the source folder; not installed: ./run in place of unsoldered):\n"
      "  unsoldered render built-in --hookup assets/demo/d-250k-linear.hookup.toml --dial 10,7,3 --out clips\n"
      "      three clips, clips/built-in_d-250k-linear_dial-10.00.wav and so on, and clips/clips.csv\n"
      "  unsoldered render built-in --hookup assets/demo/*.hookup.toml --turn 0:0,8:10 --out clips-up\n"
      "      every demo hookup with the knob going up from 0 to 10 in eight seconds\n"
      "  unsoldered render built-in --hookup assets/demo/d-250k-linear.hookup.toml --turn tone=0:10,4:0 "
      "--out clips-tone\n"
      "      the tone knob closing over four seconds, the volume knob at 10\n"
      "  unsoldered render built-in --hookup assets/demo/d-250k-linear.hookup.toml --set cable.length=\"10 m\" "
      "--depth float --out clips-long\n"
      "Your own recording goes in place of built-in.\n"
      "\n"
      "Clips line up with the take: same length, rate and channels. In 16 and 24 bits a set whose loudest clip would\n"
      "pass -1 dBFS is lowered by one common gain, given in clips.csv. The take counts as the source's own signal.\n"
      "clips.csv, also on standard output: file; hookup; dial (turn for a turning knob); gain_db; peak_dbfs, sample "
      "peak;\n"
      "peak_dbtp and loudness_lufs are not measured yet and empty.\n"
      "Listening: start quietly; a clip at 10 can be far louder than one at 4.\n"
      "Exit status: 0 done, 2 the input or the call is wrong, 3 it could not be carried out, 130 interrupted.");
  verb->callback([options, &action] { action = [options] { run(*options); }; });
}

}  // namespace unsoldered
