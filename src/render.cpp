#include "src/render.h"

#include <algorithm>
#include <array>
#include <atomic>
#include <cmath>
#include <memory>
#include <utility>

#include "dsp/error.h"
#include "src/cancel.h"
#include "src/clip_folder.h"
#include "src/clip_name.h"
#include "src/number_text.h"
#include "src/play_through.h"
#include "src/take.h"
#include "src/tasks.h"

namespace unsoldered {
namespace {

namespace fs = std::filesystem;

constexpr double kCeiling = 0.891250938133746;  // -1 dBFS

struct Clip {
  std::string file;
  const RenderHookup* hookup = nullptr;
  KnobMotion motion;
  double heard_peak = 0;    // at gain 1, before rounding
  double written_peak = 0;  // as written
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

/// The turn for one hookup; the refusal of a knob it does not have names its file.
TurningKnob turning_knob(const RenderHookup& hookup, const KnobTurn& turn) {
  try {
    return {parse_knob(hookup.hookup, turn.knob), turn.turn};
  } catch (const InputError& error) {
    throw InputError("--turn, hookup '" + hookup.file.string() + "': " + error.what());
  }
}

std::vector<Clip> plan(const RenderRequest& request) {
  std::vector<Clip> clips;
  const std::string take = take_stem(request.take);
  for (const RenderHookup& hookup : request.hookups) {
    const std::string stem = hookup_stem(hookup.file);
    if (request.turn) {
      clips.push_back({clip_name(take, stem, std::nullopt), &hookup, turning_knob(hookup, *request.turn)});
      continue;
    }
    for (const double dial : request.dials) clips.push_back({clip_name(take, stem, dial), &hookup, dial});
  }
  return clips;
}

/// What all clips of one call share while they are rendered. Any thread.
struct Shared {
  const RenderRequest& request;
  const ClipFolder& folder;
  Progress& progress;
  double gain = 1;
  bool has_ceiling = false;
  std::atomic<bool> too_loud{false};  // some clip is over the ceiling: writing is in vain, only peaks matter
};

void render_clip(std::size_t index, Clip& clip, Shared& shared, const std::stop_token& stop) {
  const auto take = open_take(shared.request.take);
  const TakeFormat format = take->format();
  ClipWriter writer(shared.folder.temporary(index), clip.file, format, shared.request.depth);
  const auto sink = [&](const double* const* channels, int frames) {
    for (int channel = 0; channel < format.channels; ++channel) {
      clip.heard_peak = std::max(clip.heard_peak, peak_of(channels[channel], frames));
    }
    if (shared.has_ceiling && clip.heard_peak > kCeiling) shared.too_loud.store(true, std::memory_order_relaxed);
    if (!shared.too_loud.load(std::memory_order_relaxed)) writer.write(channels, frames, shared.gain);
    shared.progress.advance(frames);
    stop_if_interrupted();
    return !stop.stop_requested();
  };
  try {
    play_through(*take, clip.hookup->hookup, clip.motion, sink);
  } catch (const HookupError& error) {
    throw InputError(clip.hookup->file.string() + ": " + error.what());
  }
  if (stop.stop_requested() || shared.too_loud) return;
  writer.close();
  clip.written_peak = writer.peak();
}

/// Renders the set; returns the gain that was applied.
double render_set(std::vector<Clip>& clips, const RenderRequest& request, const ClipFolder& folder, Progress& progress,
                  std::int64_t take_frames) {
  const auto count = static_cast<std::int64_t>(clips.size());
  const auto run = [&](Shared& shared) {
    progress.expect(count * take_frames);
    run_tasks(clips.size(), request.jobs,
              [&](std::size_t index, std::stop_token stop) { render_clip(index, clips[index], shared, stop); });
  };
  Shared first{request, folder, progress};
  first.has_ceiling = request.depth != Depth::float32;
  run(first);
  if (!first.too_loud) return 1;

  double peak = 0;
  for (const Clip& clip : clips) peak = std::max(peak, clip.heard_peak);
  for (std::size_t index = 0; index < clips.size(); ++index) folder.discard(index);
  Shared second{request, folder, progress};
  second.gain = kCeiling / peak;
  run(second);
  return second.gain;
}

}  // namespace

RenderResult render(const RenderRequest& request, Progress& progress) {
  RenderResult result;
  const auto take = open_take(request.take);
  if (const std::string warning = take->warning(); !warning.empty()) result.messages.push_back(warning);

  std::vector<Clip> clips = plan(request);
  std::vector<std::string> names;
  for (const Clip& clip : clips) names.push_back(clip.file);
  names.emplace_back("clips.csv");
  std::vector<fs::path> inputs;
  if (request.take != kBuiltInTake) inputs.emplace_back(request.take);
  for (const RenderHookup& hookup : request.hookups) {
    inputs.push_back(hookup.file);
    inputs.insert(inputs.end(), hookup.inputs.begin(), hookup.inputs.end());
  }
  ClipFolder folder(request.folder, names, request.force, inputs);
  folder.create();

  const double gain = render_set(clips, request, folder, progress, take->format().frames);
  for (const Clip& clip : clips) {
    const auto* dial = std::get_if<double>(&clip.motion);
    result.clips.push_back({clip.file, hookup_stem(clip.hookup->file), dial ? std::optional(*dial) : std::nullopt,
                            gain == 1 ? 0 : level_db(gain), level_db(clip.written_peak)});
  }
  if (gain != 1) {
    result.messages.push_back("all clips are lowered by " + format_number(std::round(-10 * level_db(gain)) / 10) +
                              " dB, so that the loudest peaks at -1 dBFS (--depth float needs no such room)");
  }
  folder.write(clips.size(), csv_text(clip_table(result.clips)));
  stop_if_interrupted();
  folder.publish();
  return result;
}

}  // namespace unsoldered
