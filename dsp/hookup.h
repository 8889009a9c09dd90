// A hookup: one complete answer to "what drives what": source, volume pot, treble bleed, tone, cable, extra parts,
// load.
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
  SourceOn source_on = SourceOn::top;
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
  Load load;
  std::vector<ExtraPart> extra;
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

/// The wires this hookup has: "source-top" and "wiper-output", or "source-wiper" and "top-output"; "bottom-ground";
/// "output-grid" when there is no coupling capacitor.
std::vector<Wire> replaceable_wires(const Hookup& hookup);

/// The wire `name` says, its two nodes in either order; empty when this hookup has no such wire.
std::optional<Wire> find_wire(const Hookup& hookup, const std::string& name);

/// The bands in force: those set, or 2-5 kHz (5-15 kHz for a line source) against 200-800 Hz.
Listening listening_bands(const Hookup& hookup) noexcept;

/// A knob that may turn.
enum class Knob { volume, tone };

/// "volume", "tone". Throws InputError that lists the knobs this hookup has.
Knob parse_knob(const Hookup& hookup, const std::string& name);

}  // namespace unsoldered
