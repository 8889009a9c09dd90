#include "src/hookup_blocks.h"

#include <array>
#include <optional>
#include <string>
#include <string_view>
#include <utility>
#include <vector>

#include "dsp/error.h"
#include "dsp/quantity.h"
#include "src/hookup_pot.h"

namespace unsoldered {
namespace {

// Wide enough for any real part and for textbook cases; what lies outside is a slip of a prefix.
constexpr Range kResistance{0, 1e9};
constexpr Range kShunt{1, 100e9};  // loss and leak resistances
constexpr Range kLoad{1, 10e9};
constexpr Range kCapacitor{0.01e-12, 10e-3};
constexpr Range kStray{0, 10e-3};  // capacitances that may be left at nothing
constexpr Range kInductance{1e-9, 10e3};
constexpr Range kLength{0, 1000};
constexpr NumberRange kDial{0, 10, ""};
constexpr NumberRange kGain{-120, 120, "dB"};
constexpr double kMetresPerFoot = 0.3048;

/// A resistance that may be written as "none".
std::optional<double> shunt_or_none(const TomlBlock& block, std::string_view key) {
  const toml::node* value = block.find(key);
  if (value != nullptr && value->is_string() && value->as_string()->get() == "none") {
    return std::nullopt;
  }
  return block.optional_quantity(key, Unit::ohm, kShunt);
}

/// "100 pF", "100 pF/m" or, as in some catalogues, "30 pF/ft"; in farad per metre.
std::optional<double> read_per_metre(const TomlBlock& block) {
  constexpr std::string_view key = "capacitance_per_metre";
  const std::optional<std::string> text =
      block.has(key) && block.find(key)->is_string() ? block.optional_text(key) : std::nullopt;
  const auto ends_with = [&](std::string_view end) {
    return text && text->size() > end.size() && text->compare(text->size() - end.size(), end.size(), end) == 0;
  };
  if (!ends_with("/m") && !ends_with("/ft")) {
    return block.optional_quantity(key, Unit::farad, kStray);
  }
  const std::string value = text->substr(0, text->rfind('/'));
  try {
    return parse_quantity(value, Unit::farad, kStray) / (ends_with("/ft") ? kMetresPerFoot : 1.0);
  } catch (const InputError& error) {
    block.refuse(key, error.what());
  }
}

}  // namespace

Source read_source(const TomlBlock& block) {
  const std::vector<std::string_view> every_kind = {
      "kind", "inductance", "resistance", "capacitance", "loss_resistance", "leak_resistance", "tolerance"};
  block.allow_only(every_kind);
  Source source;
  switch (block.choice("kind", {"pickup", "line", "piezo"})) {
    case 0: {
      block.allow_only({"kind", "inductance", "resistance", "capacitance", "loss_resistance", "tolerance"}, every_kind,
                       "not used by a pickup");
      source.kind = SourceKind::pickup;
      source.inductance_h = block.quantity("inductance", Unit::henry, kInductance);
      source.resistance_ohm = block.quantity("resistance", Unit::ohm, kResistance);
      source.capacitance_f = block.quantity("capacitance", Unit::farad, kStray);
      if (!block.has("loss_resistance")) {
        block.refuse_missing(
            "loss_resistance",
            "the eddy-current loss of a pickup as a resistance across it, from 1 ohm to 100G (100k to 1M are "
            "common), or \"none\" written out");
      }
      source.loss_ohm = shunt_or_none(block, "loss_resistance");
      break;
    }
    case 1:
      block.allow_only({"kind", "resistance", "capacitance", "tolerance"}, every_kind, "not used by a line source");
      source.kind = SourceKind::line;
      source.resistance_ohm = block.quantity("resistance", Unit::ohm, kResistance);
      source.capacitance_f = block.optional_quantity("capacitance", Unit::farad, kCapacitor);
      break;
    default:
      block.allow_only({"kind", "capacitance", "leak_resistance", "tolerance"}, every_kind, "not used by a piezo");
      source.kind = SourceKind::piezo;
      source.capacitance_f = block.quantity("capacitance", Unit::farad, kCapacitor);
      source.leak_ohm = shunt_or_none(block, "leak_resistance");
      break;
  }
  source.tolerance = block.tolerance();
  return source;
}

namespace {

/// The second gang of a stereo pot: what it does not say is as the first one has it.
std::optional<Pot> read_right(const TomlBlock& block, const std::filesystem::path& folder, const Pot& left) {
  const std::optional<TomlBlock> right = block.optional_block("right");
  if (!right) return std::nullopt;
  right->allow_only(with({"resistance"}, pot_keys()));
  return read_pot(*right, "resistance", folder, &left);
}

}  // namespace

Volume read_volume(const TomlBlock& block, const std::filesystem::path& folder, bool with_dial) {
  const std::vector<std::string_view> keys = with({"resistance", "source_on", "right"}, pot_keys());
  if (with_dial)
    block.allow_only(with({"dial"}, keys));
  else
    block.allow_only(keys, {"dial"}, "the volume knob's position is given with the call, as in --dial 7");
  Volume volume;
  volume.pot = read_pot(block, "resistance", folder);
  volume.right = read_right(block, folder, volume.pot);
  volume.source_on =
      block.optional_choice("source_on", {"top", "wiper"}).value_or(0) == 0 ? SourceOn::top : SourceOn::wiper;
  if (with_dial) volume.dial = block.optional_number("dial", kDial).value_or(volume.dial);
  return volume;
}

TrebleBleed read_treble_bleed(const TomlBlock& block) {
  block.allow_only({"capacitor", "parallel_resistor", "series_resistor", "tolerance"});
  TrebleBleed bleed;
  bleed.capacitor_f = block.quantity("capacitor", Unit::farad, kCapacitor);
  bleed.parallel_ohm = block.optional_quantity("parallel_resistor", Unit::ohm, kResistance);
  bleed.series_ohm = block.optional_quantity("series_resistor", Unit::ohm, kResistance);
  bleed.tolerance = block.tolerance();
  return bleed;
}

Tone read_tone(const TomlBlock& block, const std::filesystem::path& folder) {
  block.allow_only(with({"resistance", "capacitor", "position", "dial", "no_load", "right"}, pot_keys()));
  Tone tone;
  tone.pot = read_pot(block, "resistance", folder);
  tone.right = read_right(block, folder, tone.pot);
  tone.capacitor_f = block.quantity("capacitor", Unit::farad, kCapacitor);
  tone.position = block.optional_choice("position", {"source", "output"}).value_or(0) == 0 ? TonePosition::source
                                                                                           : TonePosition::output;
  tone.dial = block.optional_number("dial", kDial).value_or(10);
  tone.no_load = block.optional_flag("no_load").value_or(false);
  return tone;
}

Cable read_cable(const TomlBlock& block) {
  block.allow_only({"length", "capacitance_per_metre", "capacitance", "tolerance"});
  Cable cable;
  const std::optional<double> total_f = block.optional_quantity("capacitance", Unit::farad, kStray);
  const std::optional<double> length_m = block.optional_quantity("length", Unit::metre, kLength);
  const std::optional<double> per_metre_f = read_per_metre(block);
  if (total_f && (length_m || per_metre_f)) {
    block.refuse("capacitance",
                 "the capacitance of the whole cable is given, and a length or a capacitance per metre as "
                 "well; keep one of the two ways");
  }
  if (total_f) {
    cable.capacitance_f = *total_f;
  } else if (!length_m) {
    block.refuse_missing("length",
                         "a length from 0 m to 1000 m with capacitance_per_metre, or capacitance = \"680 pF\" as read "
                         "on a meter");
  } else if (!per_metre_f) {
    block.refuse_missing("capacitance_per_metre", "it goes with length; \"100 pF\" is common for instrument cable");
  } else {
    cable.capacitance_f = *length_m * *per_metre_f;
  }
  cable.tolerance = block.tolerance();
  return cable;
}

Load read_load(const TomlBlock& block) {
  block.allow_only({"resistance", "capacitance", "coupling", "tolerance"});
  Load load;
  load.resistance_ohm = block.quantity("resistance", Unit::ohm, kLoad);
  load.capacitance_f = block.optional_quantity("capacitance", Unit::farad, kStray).value_or(0);
  load.coupling_f = block.optional_quantity("coupling", Unit::farad, kCapacitor);
  load.tolerance = block.tolerance();
  return load;
}

SecondSource read_second(const TomlBlock& block, const std::filesystem::path& folder) {
  block.allow_only({"source", "volume", "treble_bleed", "tone"});
  SecondSource second;
  second.source = read_source(
      block.block("source", "[second.source] with kind = \"pickup\", \"line\" or \"piezo\" and its values"));
  if (const auto volume = block.optional_block("volume")) second.volume = read_volume(*volume, folder, true);
  if (const auto bleed = block.optional_block("treble_bleed")) second.treble_bleed = read_treble_bleed(*bleed);
  if (const auto tone = block.optional_block("tone")) second.tone = read_tone(*tone, folder);
  return second;
}

Selector read_selector(const TomlBlock& block) {
  block.allow_only({"use", "joined", "phase"});
  Selector selector;
  constexpr std::array uses = {SelectorUse::both, SelectorUse::first, SelectorUse::second};
  selector.use = uses.at(block.optional_choice("use", {"both", "first", "second"}).value_or(0));
  selector.joined =
      block.optional_choice("joined", {"parallel", "series"}).value_or(0) == 0 ? Joined::parallel : Joined::series;
  selector.out_of_phase = block.optional_choice("phase", {"in", "out"}).value_or(0) == 1;
  return selector;
}

Blend read_blend(const TomlBlock& block) {
  std::vector<std::string_view> keys = {"law",         "dial",           "resistance",     "travel",
                                        "dead_travel", "end_resistance", "measured_total", "tolerance"};
  block.allow_only(keys, {"taper", "measured_half"}, "a blend's law is given by law = \"MN\" or \"linear\"");
  Blend blend;
  blend.law = block.choice("law", {"MN", "linear"}) == 0 ? BlendLaw::mn : BlendLaw::linear;
  Pot like;  // gives the law, which a blend's element has no name for
  like.taper = parse_taper("linear");
  if (!block.has("resistance") && !block.has("measured_total"))
    block.refuse_missing("resistance", "the total of a gang, from 10 ohm to 100M, as in \"500k\"");
  blend.pot = read_pot(block, "resistance", {}, &like);
  blend.dial = block.optional_number("dial", kDial).value_or(blend.dial);
  return blend;
}

Stage read_stage(const TomlBlock& block, const std::filesystem::path& folder) {
  block.allow_only({"volume", "treble_bleed", "tone", "cable", "buffer"});
  Stage stage;
  if (const auto volume = block.optional_block("volume")) stage.volume = read_volume(*volume, folder, true);
  if (const auto bleed = block.optional_block("treble_bleed")) stage.treble_bleed = read_treble_bleed(*bleed);
  if (const auto tone = block.optional_block("tone")) stage.tone = read_tone(*tone, folder);
  if (const auto cable = block.optional_block("cable")) stage.cable = read_cable(*cable);
  if (const auto buffer = block.optional_block("buffer")) {
    buffer->allow_only({"input", "input_capacitance", "output", "gain_db"});
    Buffer made;
    made.input_ohm = buffer->quantity("input", Unit::ohm, kLoad);
    made.input_f = buffer->optional_quantity("input_capacitance", Unit::farad, kStray).value_or(0);
    made.output_ohm = buffer->quantity("output", Unit::ohm, kResistance);
    made.gain_db = buffer->optional_number("gain_db", kGain).value_or(0);
    stage.buffer = made;
  }
  return stage;
}

}  // namespace unsoldered
