#include "src/recorded_through.h"

#include <algorithm>
#include <cmath>
#include <iterator>
#include <map>
#include <set>
#include <tuple>
#include <utility>

#include "dsp/error.h"
#include "dsp/hookup_network.h"
#include "dsp/nodal.h"
#include "dsp/undo_filter.h"
#include "src/dial_list.h"
#include "src/hookup_file.h"
#include "src/number_text.h"

namespace unsoldered {
namespace {

constexpr double kInstrumentCable = 3 * 100e-12;  // 3 m
constexpr double kInstrumentLoadOhm = 1e6;
constexpr double kNoPotOhm = 1e12;  // a second source without a pot of its own: one that loads nothing
constexpr int kBlockFrames = 16384;
constexpr double kDialGrid = 0.1;               // of the positions that a turn passes
constexpr std::size_t kMostExactCorners = 100;  // of a turn; more of them fall to the grid

Hookup plain_lead(const Source& source, const std::optional<Volume>& volume) {
  Hookup hookup;
  hookup.source = source;
  if (volume) {
    hookup.volume = *volume;
  } else {
    hookup.volume.pot.total_ohm = kNoPotOhm;
  }
  hookup.volume.dial = 10;
  hookup.cable.emplace().capacitance_f = kInstrumentCable;
  hookup.load.resistance_ohm = kInstrumentLoadOhm;
  return hookup;
}

RecordedThrough instrument(const Hookup& first) {
  RecordedThrough recorded;
  recorded.name = "the instrument (3 m of cable, 1 Mohm)";
  const bool drives_second = driven_source(first) == Driven::second;
  recorded.hookup =
      drives_second ? plain_lead(first.second->source, first.second->volume) : plain_lead(first.source, first.volume);
  if (first.second && first.second_channel) recorded.second = plain_lead(first.second->source, first.second->volume);
  return recorded;
}

/// The emf that a channel of the take is: of the source the take drives, of the second, or of both (a mono take).
enum class Sounding { first, second, both };

/// What one channel of the take goes through: which half of stereo pots, which source.
struct Path {
  bool right = false;
  Sounding played = Sounding::first;
  Sounding recorded = Sounding::first;
  auto key() const { return std::make_tuple(right, played, recorded); }
};

/// A network without a solution is refused with the name of its hookup.
Response response_of(const std::string& name, const Hookup& hookup, bool right, Sounding sounding) {
  const Hookup half = right ? right_half(hookup) : hookup;
  const auto named = [name](const auto& compute) {
    try {
      return compute();
    } catch (const InputError& error) {
      throw InputError(name + ": " + error.what());
    }
  };
  std::vector<Driven> emfs;
  if (sounding == Sounding::both)
    emfs = {Driven::first, Driven::second};
  else
    emfs = {sounding == Sounding::second ? Driven::second : driven_source(half)};
  const auto analyses = std::make_shared<std::vector<CircuitAnalysis>>();
  for (const Driven driven : emfs) named([&] { return analyses->emplace_back(hookup_circuit(half, driven)), 0; });
  return [analyses, named](double hz) {
    std::complex<double> sum = 0;
    for (CircuitAnalysis& analysis : *analyses) sum += named([&] { return analysis.value(hz); });
    return sum;
  };
}

Response recorded_response(const RecordedThrough& recorded, const Path& path) {
  if (path.recorded == Sounding::second && recorded.second)
    return response_of(recorded.name, *recorded.second, path.right, Sounding::first);
  return response_of(recorded.name, recorded.hookup, path.right, path.recorded);
}

/// What a channel of a take is to a hookup.
Sounding sounding(const Hookup& hookup, int channel, int channels) {
  if (!hookup.second || hookup.second_channel != channel + 1) return Sounding::first;
  return channels == 1 ? Sounding::both : Sounding::second;
}

std::string frequency_text(double hz) {
  const double unit = hz >= 1000 ? 1000 : 1;
  const double step = std::pow(10, std::floor(std::log10(hz / unit)) - 2);  // three digits
  return format_number(std::round(hz / unit / step) * step) + (unit == 1 ? " Hz" : " kHz");
}

std::string band_text(const Band& band, double low, double high) {
  const bool from_start = band.from_hz <= low;
  const bool to_end = band.to_hz >= high;
  if (from_start && to_end) return "at every frequency";
  if (from_start) return "below " + frequency_text(band.to_hz);
  if (to_end) return "from " + frequency_text(band.from_hz) + " up";
  return "from " + frequency_text(band.from_hz) + " to " + frequency_text(band.to_hz);
}

void report(const UndoFilter& undo, const std::string& played, const std::string& recorded, double boost_limit_db,
            double rate_hz, std::vector<std::string>& messages) {
  const double low = undo.from_hz.value_or(kUndoLowestHz);
  const double high = pass_band_hz(rate_hz);
  std::vector<std::string> limited;
  for (Band band : undo.limited) {
    if (band.to_hz <= low) continue;
    limited.push_back(band_text(band, low, high));
  }
  if (!limited.empty()) {
    messages.push_back(played + ": " + in_a_row(limited, "and") + " the boost is held at " +
                       format_number(boost_limit_db) + " dB");
  }
  std::vector<std::string> beyond;
  if (undo.from_hz) beyond.push_back("below " + frequency_text(*undo.from_hz));
  for (const Band& band : undo.beyond_reach) {
    if (band.to_hz > low) beyond.push_back(band_text(band, low, high));
  }
  if (!beyond.empty()) {
    messages.push_back(played + ": " + in_a_row(beyond, "and") + " what " + recorded +
                       " took cannot be undone, and hardly anything is left there");
  }
  if (!undo.settled) {
    messages.push_back(played + ": taking out " + recorded +
                       " rings for longer than the program follows it; at the lowest frequencies it is not exact");
  }
}

}  // namespace

double parse_boost_limit(const std::string& text, const std::string& where) {
  const auto limit = parse_number(text);
  const std::string accepted = "; give a number of dB from 0 to " + format_number(kMostBoostLimitDb) + ", such as " +
                               format_number(kUsualBoostLimitDb);
  if (!limit) throw InputError(where + ": \"" + text + "\" is not a number of dB" + accepted);
  if (*limit < 0 || *limit > kMostBoostLimitDb) {
    throw InputError(where + ": " + format_number(*limit) + " dB is out of range" + accepted);
  }
  return *limit;
}

std::optional<RecordedThrough> parse_recorded_through(const std::string& text, const Hookup& first,
                                                      const std::string& where) {
  if (text == "nothing") return std::nullopt;
  if (text == "instrument") return instrument(first);
  if (text.empty()) {
    throw InputError(where +
                     ": \"\" names nothing; give nothing, instrument, or a hookup file, such as bench.hookup.toml@7");
  }
  std::string file = text;
  double dial = 10;
  std::error_code ignored;
  const auto at = text.rfind('@');
  if (at != std::string::npos && !std::filesystem::exists(text, ignored)) {
    file = text.substr(0, at);
    dial = parse_dial(std::string_view(text).substr(at + 1), where + ": \"" + text + "\"");
  }
  RecordedThrough recorded;
  try {
    recorded.hookup = read_hookup(file);
    recorded.inputs = files_of_hookup(file);
  } catch (const InputError& error) {
    throw InputError(where + ": " + error.what() +
                     (std::filesystem::exists(file, ignored)
                          ? ""
                          : "; accepted are nothing, instrument, or a hookup file with its "
                            "dial, such as bench.hookup.toml@7"));
  }
  recorded.hookup.volume.dial = dial;
  recorded.name = "'" + file + "' at dial " + format_number(dial);
  return recorded;
}

std::vector<Hookup> knob_positions(const Hookup& hookup, const std::vector<KnobMotion>& motions) {
  std::vector<Hookup> positions;
  std::set<std::vector<double>> seen;
  for (const KnobMotion& motion : motions) {
    if (const auto* dial = std::get_if<double>(&motion)) {
      positions.push_back(hookup);
      positions.back().volume.dial = *dial;
      continue;
    }
    const auto& knobs = std::get<std::vector<TurningKnob>>(motion);
    std::set<double> corners;
    for (const TurningKnob& knob : knobs) {
      for (const TurnPoint& corner : knob.turn.corners()) corners.insert(corner.seconds);
    }
    const auto add = [&](double seconds, double grid) {
      std::vector<double> dials;
      for (const TurningKnob& knob : knobs) {
        const double dial = knob.turn.dial(seconds);
        dials.push_back(grid > 0 ? std::round(dial / grid) * grid : dial);
      }
      if (!seen.insert(dials).second) return;
      positions.push_back(hookup);
      for (std::size_t i = 0; i < knobs.size(); ++i) set_dial(positions.back(), knobs[i].knob, dials[i]);
    };
    for (auto corner = corners.begin(); corner != corners.end(); ++corner) {
      if (corners.size() <= kMostExactCorners) add(*corner, 0);
      const auto next = std::next(corner);
      if (next == corners.end()) continue;
      double farthest = 0;
      for (const TurningKnob& knob : knobs) {
        farthest = std::max(farthest, std::abs(knob.turn.dial(*next) - knob.turn.dial(*corner)));
      }
      const int steps = static_cast<int>(std::ceil(2 * farthest / kDialGrid));
      for (int i = 0; i <= steps; ++i) add(*corner + (*next - *corner) * i / std::max(steps, 1), kDialGrid);
    }
    if (corners.size() == 1) add(*corners.begin(), 0);
  }
  return positions;
}

ChannelPlans plan_undoing(const RecordedThrough& recorded, double boost_limit_db, const std::string& played_name,
                          const std::vector<Hookup>& positions, const TakeFormat& format,
                          std::vector<std::string>& messages) {
  const bool stereo = has_right_gang(recorded.hookup) || (!positions.empty() && has_right_gang(positions.front()));
  const bool differ = stereo || recorded.second || recorded.hookup.second_channel ||
                      (!positions.empty() && positions.front().second_channel);
  std::vector<Fir> filters;
  std::vector<std::size_t> channels;
  std::map<std::tuple<bool, Sounding, Sounding>, std::size_t> known;
  std::vector<std::string> said;
  for (int channel = 0; channel < format.channels; ++channel) {
    Path path;
    if (!positions.empty()) path.played = sounding(positions.front(), channel, format.channels);
    path.right = stereo && channel % 2 == 1 && path.played != Sounding::second;  // the second's goes through both
    // Both pickups of an instrument, each on a lead of its own, have no one response: a mono take counts as the first's.
    path.recorded = recorded.second ? (path.played == Sounding::both ? Sounding::first : path.played)
                                    : sounding(recorded.hookup, channel, format.channels);
    const auto [place, is_new] = known.try_emplace(path.key(), filters.size());
    channels.push_back(place->second);
    if (!is_new) continue;
    std::vector<Response> played;
    for (const Hookup& position : positions) {
      played.push_back(response_of(played_name, position, path.right, path.played));
      if (stereo && path.played == Sounding::second)
        played.push_back(response_of(played_name, position, true, path.played));
    }
    const auto undo = design_undo_filter(recorded_response(recorded, path), played, boost_limit_db, format.rate_hz);
    if (!undo) {
      throw InputError("recorded through " + recorded.name +
                       ": nothing comes through there (under -120 dB at every frequency), so no take can have been "
                       "recorded that way; give the dial the knob was at, such as FILE@7");
    }
    report(*undo, differ ? played_name + ", channel " + std::to_string(channel + 1) : played_name, recorded.name,
           boost_limit_db, format.rate_hz, said);
    filters.push_back(undo->fir);
  }
  for (const std::string& message : said) {
    if (std::find(messages.begin(), messages.end(), message) == messages.end()) messages.push_back(message);
  }
  return make_plans(std::move(filters), channels);
}

UndoneTake::UndoneTake(std::unique_ptr<Take> take, const ChannelPlans& plans)
    : take_(std::move(take)),
      lead_(plans.front()->before()),
      stream_(plans, lead_),
      raw_(plans.size() * kBlockFrames),
      in_(plans.size(), std::vector<double>(kBlockFrames)) {}

void UndoneTake::refill() {
  ready_.clear();
  given_ = 0;
  const std::size_t channels = in_.size();
  const auto keep = [&](const double* const* planar, int frames) {
    const auto count = static_cast<std::size_t>(frames);
    const std::size_t start = ready_.size();
    ready_.resize(start + count * channels);
    for (std::size_t channel = 0; channel < channels; ++channel) {
      for (std::size_t i = 0; i < count; ++i) ready_[start + i * channels + channel] = planar[channel][i];
    }
    return true;
  };
  std::vector<const double*> pointers;
  for (const auto& one : in_) pointers.push_back(one.data());
  while (ready_.empty() && !ended_) {
    const int frames = take_->read(raw_.data(), kBlockFrames);
    if (frames == 0) {
      ended_ = true;
      stream_.finish(keep);
      break;
    }
    for (std::size_t channel = 0; channel < channels; ++channel) {
      for (std::size_t i = 0; i < static_cast<std::size_t>(frames); ++i) in_[channel][i] = raw_[i * channels + channel];
    }
    stream_.push(pointers.data(), frames, keep);
  }
}

int UndoneTake::read(double* interleaved, int frames) {
  const std::size_t wanted = static_cast<std::size_t>(frames) * in_.size();
  std::size_t done = 0;
  while (done < wanted) {
    if (given_ == ready_.size()) refill();
    if (ready_.empty()) break;
    const std::size_t count = std::min(wanted - done, ready_.size() - given_);
    std::copy_n(ready_.begin() + static_cast<std::ptrdiff_t>(given_), count, interleaved + done);
    given_ += count;
    done += count;
  }
  return static_cast<int>(done / in_.size());
}

}  // namespace unsoldered
