#include "src/render.h"

#include <algorithm>
#include <array>
#include <atomic>
#include <cmath>
#include <limits>
#include <memory>
#include <optional>
#include <utility>

#include "dsp/error.h"
#include "src/cancel.h"
#include "src/clip_folder.h"
#include "src/clip_name.h"
#include "src/clip_writer.h"
#include "src/decoded_clip.h"
#include "src/loudness.h"
#include "src/loudness_match.h"
#include "src/number_text.h"
#include "src/play_through.h"
#include "src/take.h"
#include "src/tasks.h"

namespace unsoldered {
namespace {

namespace fs = std::filesystem;

constexpr double kCeiling = 0.891250938133746;  // -1 dBFS, -1 dBTP

struct Clip {
  std::string file;
  const RenderHookup* hookup = nullptr;
  KnobMotion motion;
  const ChannelPlans* undo = nullptr;     // what takes out what the take was recorded through
  double heard_peak = 0;                  // at gain 1, before rounding; in lossy formats the true peak
  std::optional<Loudness> loudness = {};  // at gain 1, before rounding
  double gain = 1;
  bool has_no_loudness = false;  // left out of the match
  double written_peak = 0;       // as written
  double decoded_peak = 0;       // lossy formats: true peak of what comes back
};

double level_db(double magnitude) { return 20 * std::log10(magnitude); }  // -infinity for 0

/// Largest magnitude; several running maxima, because one alone would wait for itself.
double peak_of(const double* samples, int frames) {
  std::array<double, 8> peaks{};
  const auto count = static_cast<std::size_t>(frames);
  const std::size_t whole = count - count % peaks.size();
  for (std::size_t i = 0; i < whole; i += peaks.size()) {
    for (std::size_t lane = 0; lane < peaks.size(); ++lane) {
      peaks[lane] = std::max(peaks[lane], std::abs(samples[i + lane]));
    }
  }
  for (std::size_t i = whole; i < count; ++i) peaks[0] = std::max(peaks[0], std::abs(samples[i]));
  return *std::max_element(peaks.begin(), peaks.end());
}

/// The turns for one hookup; the refusal of a knob it does not have names its file.
std::vector<TurningKnob> turning_knobs(const RenderHookup& hookup, const std::vector<KnobTurn>& turns) {
  std::vector<TurningKnob> knobs;
  for (const KnobTurn& turn : turns) {
    const auto refuse = [&](const std::string& why) {
      throw InputError("--turn, hookup '" + hookup.file.string() + "': " + why);
    };
    try {
      knobs.push_back({parse_knob(hookup.hookup, turn.knob), turn.turn});
    } catch (const InputError& error) {
      refuse(error.what());
    }
    for (std::size_t i = 0; i + 1 < knobs.size(); ++i)
      if (knobs[i].knob == knobs.back().knob)
        refuse("the knob \"" + turn.knob + "\" is given two turns; write all its points in one");
  }
  return knobs;
}

/// "volume knob turning", "volume and tone knobs turning".
std::string turning_text(const std::vector<KnobTurn>& turns) {
  std::string names;
  for (const KnobTurn& turn : turns) names += (names.empty() ? "" : " and ") + turn.knob;
  return names + (turns.size() == 1 ? " knob turning" : " knobs turning");
}

/// What the hookup is called in the names of its clips and in their list.
std::string stem_of(const RenderHookup& hookup) { return hookup.name.empty() ? hookup_stem(hookup.file) : hookup.name; }

std::vector<Clip> plan(const RenderRequest& request) {
  std::vector<Clip> clips;
  const std::string take = take_stem(request.take);
  const char* ending = file_ending(request.format.kind);
  for (const RenderHookup& hookup : request.hookups) {
    const std::string stem = stem_of(hookup);
    if (!request.turns.empty()) {
      clips.push_back({clip_name(take, stem, std::nullopt, ending), &hookup, turning_knobs(hookup, request.turns)});
      continue;
    }
    for (const double dial : hookup.dial ? std::vector{*hookup.dial} : request.dials) {
      clips.push_back({clip_name(take, stem, dial, ending), &hookup, dial});
    }
  }
  return clips;
}

/// What takes out the recording's own hookup, one for each hookup that is played; the clips are told theirs.
std::vector<ChannelPlans> undo_recording(std::vector<Clip>& clips, const RenderRequest& request,
                                         const TakeFormat& format, std::vector<std::string>& messages) {
  std::vector<ChannelPlans> plans(request.recorded_through ? request.hookups.size() : 0);
  for (std::size_t i = 0; i < plans.size(); ++i) {
    std::vector<KnobMotion> motions;
    for (Clip& clip : clips) {
      if (clip.hookup != &request.hookups[i]) continue;
      motions.push_back(clip.motion);
      clip.undo = &plans[i];
    }
    plans[i] = plan_undoing(*request.recorded_through, request.boost_limit_db, request.hookups[i].file.string(),
                            knob_positions(request.hookups[i].hookup, motions), format, messages);
  }
  return plans;
}

std::optional<double> dial_of(const Clip& clip) {
  const auto* dial = std::get_if<double>(&clip.motion);
  return dial ? std::optional(*dial) : std::nullopt;
}

/// What is compared with what: the clips of one dial position, or those of hookups that each have their own.
std::optional<double> mark_of(const Clip& clip) { return clip.hookup->dial ? std::nullopt : dial_of(clip); }

double gain_db(const Clip& clip) { return clip.gain == 1 ? 0 : level_db(clip.gain); }

/// 0 where rounding leaves -0.
std::string rounded_db(double db) { return format_number(std::round(100 * db) / 100 + 0.0) + " dB"; }

/// What the file says of itself.
ClipText text_of(const Clip& clip, const RenderRequest& request) {
  const std::string stem = stem_of(*clip.hookup);
  const std::string& title = clip.hookup->hookup.title;
  const auto dial = dial_of(clip);
  return {take_stem(request.take) + ", " + (title.empty() ? stem : title),
          "hookup " + stem + ", " + (dial ? "dial " + format_number(*dial) : turning_text(request.turns)) + ", gain " +
              rounded_db(gain_db(clip))};
}

enum class Pass {
  write,             // as the clips are
  write_if_it_fits,  // likewise, until one is over the ceiling; then only peaks matter
  measure            // no files
};

/// What all clips of one pass share while they are rendered. Any thread.
struct Shared {
  const RenderRequest& request;
  const ClipFolder& folder;
  Progress& progress;
  Pass pass;
  bool measures;                      // true peak and loudness
  const HeardThrough* heard;          // null: nothing
  std::atomic<bool> too_loud{false};  // some clip is over the ceiling: writing is in vain

  bool writes() const noexcept { return pass != Pass::measure && !too_loud.load(std::memory_order_relaxed); }
};

/// One clip in one pass, block by block.
class ClipPass {
 public:
  ClipPass(std::size_t index, Clip& clip, Shared& shared, const TakeFormat& format)
      : clip_(clip), shared_(shared), channels_(format.channels), path_(shared.folder.temporary(index)) {
    if (shared.measures) meter_.emplace(format.rate_hz, format.channels);
    if (shared.pass != Pass::measure) {
      writer_.emplace(path_, clip.file, format, shared.request.format, text_of(clip, shared.request));
    }
  }

  void add(const double* const* channels, int frames) {
    frames_ += frames;
    if (meter_) meter_->add(channels, frames);
    if (lossy()) {
      if (meter_) note_peak(meter_->true_peak());
    } else {
      for (int channel = 0; channel < channels_; ++channel) note_peak(peak_of(channels[channel], frames));
    }
    if (shared_.writes()) writer_->write(channels, frames, clip_.gain);
  }

  void finish() {
    if (meter_) {
      clip_.loudness = meter_->finish();
      if (lossy()) note_peak(clip_.loudness->true_peak());
    }
    if (!shared_.writes()) return;
    writer_->close();
    clip_.written_peak = writer_->peak();
    if (lossy()) check_decoded();
  }

 private:
  bool lossy() const noexcept { return is_lossy(shared_.request.format.kind); }

  void note_peak(double peak) {
    clip_.heard_peak = std::max(clip_.heard_peak, peak);
    if (shared_.pass == Pass::write_if_it_fits && clip_.heard_peak > kCeiling) {
      shared_.too_loud.store(true, std::memory_order_relaxed);
    }
  }

  void check_decoded() const {
    const DecodedClip decoded = measure_decoded(path_, clip_.file);
    if (decoded.frames != frames_) {
      throw CannotError("cannot write '" + clip_.file + "': decoded again it has " + std::to_string(decoded.frames) +
                        " samples instead of " + std::to_string(frames_) + "; give --format flac or wav");
    }
    clip_.decoded_peak = decoded.true_peak;
  }

  Clip& clip_;
  Shared& shared_;
  int channels_;
  std::int64_t frames_ = 0;
  fs::path path_;
  std::optional<LoudnessMeter> meter_;
  std::optional<ClipWriter> writer_;
};

void render_clip(std::size_t index, Clip& clip, Shared& shared, const std::stop_token& stop) {
  std::unique_ptr<Take> take = open_take(shared.request.take);
  if (clip.undo != nullptr) take = std::make_unique<UndoneTake>(std::move(take), *clip.undo);
  std::optional<ConvolvedStream> heard;
  if (shared.heard) heard.emplace(shared.heard->plans);
  ClipPass pass(index, clip, shared, take->format());
  const auto load = [&](const double* const* channels, int frames) {
    pass.add(channels, frames);
    shared.progress.advance(frames);
    stop_if_interrupted();
    return !stop.stop_requested();
  };
  const auto sink = [&](const double* const* channels, int frames) {
    return heard ? heard->push(channels, frames, load) : load(channels, frames);
  };
  try {
    play_through(*take, clip.hookup->hookup, clip.motion, sink);
  } catch (const HookupError& error) {
    throw InputError(clip.hookup->file.string() + ": " + error.what());
  }
  if (heard && !stop.stop_requested()) heard->finish(load);
  if (!stop.stop_requested()) pass.finish();
}

/// Gains that give the hookups at each dial position one loudness.
void match(std::vector<Clip>& clips) {
  std::vector<Clip*> left;
  for (Clip& clip : clips) left.push_back(&clip);
  while (!left.empty()) {
    const auto mark = mark_of(*left.front());
    const auto others =
        std::stable_partition(left.begin(), left.end(), [&](const Clip* clip) { return mark_of(*clip) == mark; });
    std::vector<const Loudness*> measured;
    for (auto clip = left.begin(); clip != others; ++clip) measured.push_back(&*(*clip)->loudness);
    const auto gains = match_loudness(measured, kCeiling);
    for (std::size_t i = 0; i < gains.size(); ++i) {
      left[i]->gain = gains[i].gain;
      left[i]->has_no_loudness = gains[i].left_out;
    }
    left.erase(left.begin(), others);
  }
}

/// Renders the set: once, or twice when gains have to be known first.
void render_set(std::vector<Clip>& clips, const RenderRequest& request, const ClipFolder& folder, Progress& progress,
                std::int64_t take_frames, const HeardThrough* heard) {
  const bool lossy = is_lossy(request.format.kind);
  const bool has_ceiling = lossy || is_integer(request.format);
  const auto count = static_cast<std::int64_t>(clips.size());
  // A header may claim any length.
  const std::int64_t expected = std::min(take_frames, std::numeric_limits<std::int64_t>::max() / (4 * count));
  const auto run = [&](Pass pass, bool measures) {
    Shared shared{request, folder, progress, pass, measures, heard};
    progress.expect(count * expected);
    run_tasks(clips.size(), request.jobs,
              [&](std::size_t index, std::stop_token stop) { render_clip(index, clips[index], shared, stop); });
    return !shared.too_loud;
  };
  if (request.match_loudness) {
    run(Pass::measure, true);
    match(clips);
    run(Pass::write, false);
    return;
  }
  if (run(has_ceiling ? Pass::write_if_it_fits : Pass::write, lossy || request.measure)) return;

  double peak = 0;
  for (const Clip& clip : clips) peak = std::max(peak, clip.heard_peak);
  for (std::size_t index = 0; index < clips.size(); ++index) folder.discard(index);
  for (Clip& clip : clips) clip.gain = kCeiling / peak;
  run(Pass::write, false);
}

/// What the user should know about the levels.
void report_levels(const std::vector<Clip>& clips, const RenderRequest& request, std::vector<std::string>& messages) {
  const bool lossy = is_lossy(request.format.kind);
  const double common = gain_db(clips.front());
  if (request.match_loudness) {
    for (const Clip& clip : clips) {
      if (!clip.has_no_loudness) continue;
      messages.push_back("'" + clip.file + "' is left out of the match: nothing in it is above " +
                         format_number(kAbsoluteGateLufs) + " LUFS");
    }
  } else if (common != 0) {
    const double lowered = std::round(-10 * common) / 10;
    messages.push_back("all clips are lowered by " + (lowered > 0 ? format_number(lowered) : "less than 0.1") +
                       " dB, so that the loudest peaks at -1 " + (lossy ? "dBTP" : "dBFS") +
                       " (--format wav --depth float needs no such room)");
  }
  const auto most = std::max_element(clips.begin(), clips.end(), [](const Clip& one, const Clip& other) {
    return one.decoded_peak < other.decoded_peak;
  });
  if (most->decoded_peak > 1) {
    messages.push_back("encoding raised peaks: decoded again, '" + most->file + "' reaches " +
                       rounded_db(level_db(most->decoded_peak)) +
                       " over full scale, where a player may clip; --format flac or wav keeps peaks as they are");
  }
}

ClipRow row_of(const Clip& clip) {
  ClipRow row{clip.file, stem_of(*clip.hookup), dial_of(clip), gain_db(clip), level_db(clip.written_peak)};
  if (clip.loudness) {
    row.peak_dbtp = level_db(clip.loudness->true_peak(clip.gain));
    row.loudness_lufs = clip.loudness->integrated_lufs(clip.gain);
  }
  return row;
}

}  // namespace

RenderResult render(const RenderRequest& request, Progress& progress) {
  RenderResult result;
  const auto take = open_take(request.take);
  check_can_hold(request.format.kind, take->format());
  if (const std::string warning = take->warning(); !warning.empty()) result.messages.push_back(warning);

  for (const RenderHookup& hookup : request.hookups) {
    if (hookup.hookup.second && hookup.hookup.selector.use == SelectorUse::both && !hookup.hookup.second_channel)
      result.messages.push_back(
          stem_of(hookup) +
          ": only the first source sounds, the second one loads it; second_channel = 2 makes channel "
          "2 of a take the second one's own, and 1 gives a mono take to both");
  }

  std::vector<Clip> clips = plan(request);
  const std::vector<ChannelPlans> undo = undo_recording(clips, request, take->format(), result.messages);
  const auto heard = open_heard_through(request.heard_through, take->format(), "--heard-through");
  if (heard && !heard->warning.empty()) result.messages.push_back(heard->warning);
  std::vector<std::string> names;
  for (const Clip& clip : clips) names.push_back(clip.file);
  names.emplace_back("clips.csv");
  std::vector<fs::path> inputs;
  if (request.take != kBuiltInTake) inputs.emplace_back(request.take);
  for (const RenderHookup& hookup : request.hookups) {
    inputs.push_back(hookup.file);
    inputs.insert(inputs.end(), hookup.inputs.begin(), hookup.inputs.end());
  }
  if (request.recorded_through) {
    inputs.insert(inputs.end(), request.recorded_through->inputs.begin(), request.recorded_through->inputs.end());
  }
  if (heard) inputs.insert(inputs.end(), heard->inputs.begin(), heard->inputs.end());
  ClipFolder folder(request.folder, names, request.force, inputs);
  folder.create();

  render_set(clips, request, folder, progress, take->format().frames, heard ? &*heard : nullptr);
  for (const Clip& clip : clips) result.clips.push_back(row_of(clip));
  report_levels(clips, request, result.messages);
  folder.write(clips.size(), csv_text(clip_table(result.clips)));
  stop_if_interrupted();
  folder.publish();
  return result;
}

}  // namespace unsoldered
