// unsoldered render TAKE --hookup F … | [TAKE] --job JOB [--dial 10,7,3 | --turn "0:0,8:10"] --out DIR
#include <algorithm>
#include <cstdio>
#include <iostream>
#include <memory>
#include <optional>
#include <string>
#include <string_view>
#include <thread>
#include <vector>

#include "dsp/error.h"
#include "src/count_option.h"
#include "src/dial_list.h"
#include "src/hookup_file.h"
#include "src/job_render.h"
#include "src/progress.h"
#include "src/render.h"
#include "src/verb.h"

namespace unsoldered {
namespace {

constexpr int kMostJobs = 256;

struct RenderOptions {
  std::string take;
  std::vector<std::string> hookups;
  std::optional<std::string> job;
  std::vector<std::string> dials;
  std::vector<std::string> turns;
  std::vector<std::string> settings;
  std::string folder;
  std::string format = "wav";
  std::optional<std::string> depth;
  bool measure = false;
  bool match_loudness = false;
  std::optional<std::string> jobs;
  std::optional<std::string> recorded_through;
  std::optional<std::string> boost_limit;
  std::optional<std::string> heard_through;
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

std::vector<KnobTurn> turns_of(const RenderOptions& options) {
  if (!options.turns.empty() && !options.dials.empty()) {
    throw InputError("--dial and --turn: a clip has the knob held or turning; give one of the two");
  }
  std::vector<KnobTurn> turns;
  for (const std::string& text : options.turns) {
    turns.push_back(parse_knob_turn(text, "--turn"));
    for (std::size_t i = 0; i + 1 < turns.size(); ++i)
      if (turns[i].knob == turns.back().knob)
        throw InputError("--turn: the " + turns.back().knob + " knob is given two turns; write all its points in one");
  }
  return turns;
}

int jobs_of(const RenderOptions& options) {
  if (options.jobs) return parse_count(*options.jobs, "--jobs", 1, kMostJobs);
  return std::clamp(static_cast<int>(std::thread::hardware_concurrency()), 1, kMostJobs);
}

/// What the command line does not say, the job does. True when the job says what its take was recorded through.
bool request_from_job(const RenderOptions& options, RenderRequest& request) {
  if (!options.hookups.empty()) {
    throw InputError("--job and --hookup: a job brings its own hookups; give one of the two");
  }
  const Job job = read_job(*options.job, {options.take, options.settings});
  request_job(job, request);
  if (!options.take.empty()) request.take = options.take;  // spelled as in the call
  if (!options.dials.empty()) {
    for (RenderHookup& hookup : request.hookups) hookup.dial.reset();
  }
  const Hookup& first = request.hookups.front().hookup;
  if (!options.recorded_through && job.take.recorded_through) {
    request.recorded_through = parse_recorded_through(recorded_through_text(job), first, *options.job);
    request.boost_limit_db = job.take.recorded_through->boost_limit_db;
  }
  if (!options.heard_through) request.heard_through = heard_through_text(job);
  return job.take.recorded_through.has_value();
}

void run(const RenderOptions& options) {
  RenderRequest request;
  request.take = options.take;
  request.format = parse_clip_format(options.format, options.depth);
  request.measure = options.measure;
  request.match_loudness = options.match_loudness;
  request.turns = turns_of(options);
  request.dials = dials_of(options);
  request.folder = options.folder;
  request.jobs = jobs_of(options);
  request.force = options.force;
  bool recording_is_said = options.recorded_through.has_value();
  if (options.job) recording_is_said = request_from_job(options, request) || recording_is_said;
  for (const std::string& file : options.hookups) {
    request.hookups.push_back({file, read_hookup(file, options.settings), files_of_hookup(file, options.settings)});
  }

  if (options.recorded_through) {
    request.recorded_through =
        parse_recorded_through(*options.recorded_through, request.hookups.front().hookup, "--recorded-through");
  }
  if (options.boost_limit) {
    request.boost_limit_db = parse_boost_limit(*options.boost_limit, "--boost-limit");
    if (!request.recorded_through)
      throw InputError(
          "--boost-limit " + *options.boost_limit +
          ": nothing is taken out of the take, so nothing is boosted; say what it was recorded through with "
          "--recorded-through, or leave the limit out");
  }
  if (options.heard_through) request.heard_through = *options.heard_through;

  RenderResult result;
  {
    Progress progress("rendering", stderr);
    result = render(request, progress);
  }
  if (!recording_is_said) {
    std::cerr << "unsoldered render: the take counts as the signal inside the source; --recorded-through says "
                 "otherwise\n";
  }
  for (const std::string& message : result.messages) std::cerr << "unsoldered render: " << message << '\n';
  print_table(clip_table(result.clips), options.json);
}

}  // namespace

void add_render_verb(CLI::App& app, VerbAction& action) {
  const auto options = std::make_shared<RenderOptions>();
  CLI::App* verb = app.add_subcommand(
      "render", "Plays a take through hookups and writes clips, one for every hookup and knob position");
  verb->add_option("TAKE", options->take,
                   "WAV (also RF64 and W64), AIFF or FLAC file, or the word built-in for a phrase of\nplucked strings");
  verb->add_option("--hookup", options->hookups, "Hookup files; may be repeated")->type_name("FILE");
  verb->add_option("--job", options->job,
                   "A job file in place of hookups: its take (TAKE, when given, stands in for it),\n"
                   "its candidates, and what the take was recorded and is heard through; its\n"
                   "loop is for listening, clips hold the whole take")
      ->type_name("FILE");
  verb->add_option("--dial", options->dials,
                   "Volume knob positions 0 to 10, a clip for each (default 10; in a job each\n"
                   "candidate's own)")
      ->allow_extra_args(false)
      ->type_name("10,7,3");
  verb->add_option("--turn", options->turns,
                   "The knob turns instead: points seconds:dial joined by straight lines,\n"
                   "held before the first and after the last; two points at one time are\n"
                   "a ramp of 5 ms. tone=0:10,4:0 turns the tone knob; likewise second.volume,\n"
                   "second.tone, blend, pedal, then.0.volume, extra.0; may be repeated: several\n"
                   "knobs turn at once")
      ->allow_extra_args(false)
      ->type_name("0:0,8:10");
  verb->add_option("--out", options->folder, "Folder for the clips and clips.csv; made if missing; always needed")
      ->type_name("FOLDER");
  verb->add_option("--set", options->settings,
                   "Overrides a value in every hookup, such as tone.dial=4; may be repeated")
      ->allow_extra_args(false)
      ->type_name("KEY=VALUE");
  verb->add_option("--format", options->format,
                   "File format. mp3 (320 kbit/s, nothing above 20 kHz, rates up to 48 kHz)\n"
                   "and ogg (Vorbis at its best, rates up to 200 kHz) are lossy and hold 1 or 2\n"
                   "channels")
      ->type_name("wav|flac|mp3|ogg")
      ->capture_default_str();
  verb->add_option("--depth", options->depth,
                   "Bits a sample: 16 (dithered), 24 (default) or, in WAV, float;\nmp3 and ogg have none to choose")
      ->type_name("16|24|float");
  verb->add_flag("--measure", options->measure, "Measures loudness and true peak of each clip too")
      ->disable_flag_override();
  verb->add_flag("--match-loudness", options->match_loudness,
                 "Brings the hookups at each dial position to one loudness, the highest\n"
                 "that keeps them all under -1 dBTP. To match a 10 with a 7, make them\n"
                 "candidates of a job, each at its own dial")
      ->disable_flag_override();
  verb->add_option("--recorded-through", options->recorded_through,
                   "What the take passed when it was recorded, taken out first: nothing\n"
                   "(default), instrument (the first hookup's source, knob at 10, 3 m of cable,\n"
                   "1M), or a hookup file with its dial, such as bench.hookup.toml@7")
      ->type_name("nothing|instrument|FILE[@DIAL]");
  verb->add_option("--boost-limit", options->boost_limit,
                   "Most that taking it out may boost any frequency, 0 to 60 dB (default 24)")
      ->type_name("DB");
  verb->add_option("--heard-through", options->heard_through,
                   "After the load: nothing (default), guitar-loudspeaker (computed, generic), or\n"
                   "an impulse response of the take's rate, up to 10 s, used as it is")
      ->type_name("nothing|guitar-loudspeaker|FILE");
  verb->add_option("--jobs", options->jobs, "Clips rendered at one time, 1 to 256 (default: one a processor core)")
      ->type_name("N");
  verb->add_flag("--force", options->force, "Replaces clips that are already there")->disable_flag_override();
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
      "  unsoldered render --job assets/demo/dull-at-7.job.toml --out clips-job\n"
      "      every candidate of the job at its dial, clips-job/built-in_A-as-it-came_dial-07.00.wav and so on\n"
      "Your own recording goes in place of built-in.\n"
      "\n"
      "Clips line up with the take: same length, rate and channels. In 16 and 24 bits a set whose loudest clip would\n"
      "pass -1 dBFS, in mp3 and ogg -1 dBTP, is lowered by one common gain, given in clips.csv; float is not.\n"
      "Files carry the take, the hookup, the dial and the gain as title and comment where the format has a place.\n"
      "clips.csv, also on standard output: file; hookup; dial (turn for a turning knob); gain_db, all gains together;\n"
      "peak_dbfs, sample peak; peak_dbtp, peak between the samples, and loudness_lufs, integrated loudness (ITU-R\n"
      "BS.1770; ungated under 3 s), both filled with --measure, --match-loudness, mp3 and ogg. Levels of mp3 and ogg "
      "are\n"
      "those before encoding. A mono clip measures as one front channel, 3 LU below the same in both of two channels.\n"
      "--match-loudness leaves out clips with nothing above -70 LUFS and says which; turning clips are matched as "
      "wholes.\n"
      "Listening: start quietly; a clip at 10 can be far louder than one at 4.\n"
      "Exit status: 0 done, 2 the input or the call is wrong, 3 it could not be carried out, 130 interrupted.");
  verb->callback([options, verb, &action] {
    // Which of them are needed depends on --job, so the parser cannot tell.
    for (const char* name : {"TAKE", "--hookup", "--out"}) {
      const bool by_job = options->job && std::string_view(name) != "--out";
      if (!by_job && verb->get_option(name)->count() == 0) throw CLI::RequiredError(name);
    }
    action = [options] { run(*options); };
  });
}

}  // namespace unsoldered
