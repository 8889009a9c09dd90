// A hookup: one complete answer to "what drives what": one or two sources with their controls, selector or blend, cable,
// further stages, extra parts, load.
//
// Plain values in SI units. How they become a circuit is in hookup_network.h; how they are written in a file is src/'s.
#pragma once

#include <optional>
#include <string>
#include <utility>
#include <vector>

#include "dsp/error.h"
#include "dsp/pot.h"

namespace unsoldered {

enum class SourceKind { pickup, line, piezo };

/// Pickup: emf - R - coil - L - source, with C and the loss resistance from source to ground.
/// Line: emf - R (- series C when capacitance_f is set) - source. Piezo: emf - C - source, leak from source to ground.
struct Source {
  SourceKind kind = SourceKind::pickup;
  double resistance_ohm = 0;
  double inductance_h = 0;
  std::optional<double> capacitance_f;
  std::optional<double> loss_ohm;  // pickup only; empty: "none"
  std::optional<double> leak_ohm;  // piezo only
  std::optional<double> tolerance;
};

enum class SourceOn { top, wiper };

struct Volume {
  Pot pot;
  std::optional<Pot> right;  // second gang of a stereo pot; empty: like the first
  SourceOn source_on = SourceOn::top;
  double dial = 10;  // a file gives it for a second volume and for further stages, the call for the main one
};

/// From the top lug to the wiper. At most one of the two resistors.
struct TrebleBleed {
  double capacitor_f = 0;
  std::optional<double> parallel_ohm;
  std::optional<double> series_ohm;
  std::optional<double> tolerance;
};

enum class TonePosition { source, output };

/// A rheostat (the section below the wiper) in series with a capacitor to ground.
struct Tone {
  Pot pot;
  std::optional<Pot> right;
  double capacitor_f = 0;
  TonePosition position = TonePosition::source;
  double dial = 10;
  bool no_load = false;  // true: open circuit at 10
};

struct Cable {
  double capacitance_f = 0;
  std::optional<double> tolerance;
};

struct Load {
  double resistance_ohm = 0;
  double capacitance_f = 0;
  std::optional<double> coupling_f;  // in series, between output and grid
  std::optional<double> tolerance;
};

/// A second source with controls of its own, joined with the first one's by the selector or the blend.
struct SecondSource {
  Source source;
  std::optional<Volume> volume;
  std::optional<TrebleBleed> treble_bleed;
  std::optional<Tone> tone;
};

enum class SelectorUse { both, first, second };
enum class Joined { parallel, series };

struct Selector {
  SelectorUse use = SelectorUse::both;
  Joined joined = Joined::parallel;
  bool out_of_phase = false;  // the second source reversed
};

/// MN: two gangs, each source on a wiper, top lugs joined at the output, bottom lugs on ground; each gang is full from the
/// middle on. Linear: one track from source to source, the output on its wiper.
enum class BlendLaw { mn, linear };

struct Blend {
  BlendLaw law = BlendLaw::mn;
  Pot pot;  // its taper is the law's
  double dial = 5;
};

/// An amplifier of fixed gain between two networks: what follows does not load what comes before.
struct Buffer {
  double input_ohm = 1e6;
  double input_f = 0;
  double output_ohm = 0;
  double gain_db = 0;
};

/// A further stage after the first cable, such as a volume pedal and its lead. A buffer comes with at most a cable.
struct Stage {
  std::optional<Volume> volume;
  std::optional<TrebleBleed> treble_bleed;
  std::optional<Tone> tone;
  std::optional<Buffer> buffer;
  std::optional<Cable> cable;
};

enum class PartKind { resistor, capacitor, inductor, pot };

/// A part between any two nodes (a pot: three, in the order top, wiper, bottom).
struct ExtraPart {
  PartKind kind = PartKind::resistor;
  double value = 0;                  // ohm, farad or henry
  std::vector<std::string> between;  // node names
  std::string in_place_of;           // a wire such as "source-top" that this part replaces; empty: none
  Pot pot;                           // kind == pot
  double dial = 10;                  // kind == pot
  std::optional<double> tolerance;
};

struct Band {
  double from_hz = 0;
  double to_hz = 0;
};

/// Bands of the treble-lost figure.
struct Listening {
  Band treble;
  Band body;
};

struct Hookup {
  std::string title;
  Source source;
  Volume volume;
  std::optional<TrebleBleed> treble_bleed;
  std::optional<Tone> tone;
  std::optional<Cable> cable;
  std::optional<SecondSource> second;
  Selector selector;
  std::optional<Blend> blend;
  std::vector<Stage> then;
  Load load;
  std::vector<ExtraPart> extra;
  std::optional<int> second_channel;   // of a take, from 1: the second source's own signal
  std::optional<Listening> listening;  // empty: the usual bands for the kind of source
};

/// A rule between the values of a hookup is broken. `key()` is the dotted key as in a hookup file ("extra.0.between").
class HookupError : public InputError {
 public:
  HookupError(std::string key, const std::string& what) : InputError(what), key_(std::move(key)) {}
  const std::string& key() const noexcept { return key_; }

 private:
  std::string key_;
};

/// Checks what no single value shows: ends and dead travel against the whole, resistors of the treble bleed, bands, and
/// the places of the extra parts. Throws HookupError. Whether the network has a solution is asked elsewhere.
void validate(const Hookup& hookup);

/// A wire of the drawing that a part may stand in for, its nodes in the order of the signal.
struct Wire {
  std::string from;
  std::string to;
  std::string name() const { return from + "-" + to; }
};

/// The wires this hookup has, such as "source-top" and "wiper-output", or "source-wiper" and "top-output".
std::vector<Wire> replaceable_wires(const Hookup& hookup);

/// The wire `name` says, its two nodes in either order; empty when this hookup has no such wire.
std::optional<Wire> find_wire(const Hookup& hookup, const std::string& name);

/// The bands in force: those set, or 2-5 kHz (5-15 kHz for a line source) against 200-800 Hz.
Listening listening_bands(const Hookup& hookup) noexcept;

/// The source a take drives: the first one, or the second where the selector uses that alone and no channel of the take is
/// the second's own.
enum class Driven { first, second };
Driven driven_source(const Hookup& hookup) noexcept;

/// The two halves of a stereo pot.
enum class Gang { left, right };

/// True when some pot has a second gang of its own.
bool has_right_gang(const Hookup& hookup) noexcept;

/// The hookup as the second gang has it: every pot's right half in the place of its left one.
Hookup right_half(const Hookup& hookup);

enum class KnobKind { volume, tone, second_volume, second_tone, blend, stage_volume, stage_tone, extra };

/// A knob that may turn. `number` counts further stages or extra parts, from 0.
struct Knob {
  KnobKind kind = KnobKind::volume;
  int number = 0;

  static const Knob volume;
  static const Knob tone;

  bool operator==(const Knob&) const = default;
};
inline constexpr Knob Knob::volume{KnobKind::volume, 0};
inline constexpr Knob Knob::tone{KnobKind::tone, 0};

/// All knobs of a hookup and their names as in a hookup file: "volume", "tone", "second.volume", "second.tone", "blend",
/// "then.0.volume", "then.0.tone", "extra.0".
struct NamedKnob {
  std::string name;
  Knob knob;
};
std::vector<NamedKnob> knobs_of(const Hookup& hookup);

/// One of those names, or "pedal" for the first further stage that has a volume. Throws InputError that lists the knobs
/// this hookup has.
Knob parse_knob(const Hookup& hookup, const std::string& name);

/// Puts a knob that the hookup has at a dial, 0..10.
void set_dial(Hookup& hookup, const Knob& knob, double dial);

}  // namespace unsoldered
