#include "src/hookup_pot.h"

#include <optional>
#include <string>
#include <utility>

#include "dsp/error.h"
#include "src/hookup_measured.h"
#include "src/number_text.h"

namespace unsoldered {
namespace {

constexpr Range kTotal{10, 100e6};
constexpr Range kReading{0, 100e6};
constexpr Range kEnd{0, 50e6};
constexpr NumberRange kTravel{10, 3600, "degrees"};
constexpr NumberRange kDeadTravel{0, 3600, "degrees"};
constexpr NumberRange kShare{0, 1, ""};
constexpr std::string_view kTaperForms =
    "\"linear\", \"audio 15%\" (N from 1 to 49, also ideal, reverse, ideal reverse), { sections = [[0,0], …, [1,1]] } "
    "or "
    "{ measured = \"file.csv\" }";

std::vector<TaperPoint> read_sections(const TomlBlock& block) {
  const toml::node* value = block.find("sections");
  const toml::array* list = value->as_array();
  constexpr std::string_view wanted = "a list of [travel, share] corners from [0, 0] to [1, 1]";
  if (list == nullptr) {
    block.refuse_type("sections", *value, wanted);
  }
  std::vector<TaperPoint> points;
  for (const toml::node& entry : *list) {
    const toml::array* pair = entry.as_array();
    if (pair == nullptr || pair->size() != 2) {
      block.refuse("sections",
                   "entry " + std::to_string(points.size() + 1) + " is not a pair; wanted is " + std::string(wanted));
    }
    points.push_back(
        {block.number_of("sections", (*pair)[0], kShare), block.number_of("sections", (*pair)[1], kShare)});
  }
  return points;
}

Taper read_taper_table(const TomlBlock& block, const std::filesystem::path& folder) {
  block.allow_only({"sections", "measured"});
  if (block.has("sections") == block.has("measured")) {
    if (block.has("sections")) {
      block.refuse("measured", "stands beside sections, and both give the law; take one of them out");
    }
    block.refuse_missing("sections", "one of sections = [[0,0], …, [1,1]] and measured = \"file.csv\"");
  }
  if (block.has("sections")) {
    std::vector<TaperPoint> corners = read_sections(block);
    try {
      return Taper::sections(std::move(corners));
    } catch (const InputError& error) {
      block.refuse("sections", error.what());
    }
  }
  const std::string file = block.text("measured", "the name of a CSV file");
  try {
    return read_measured_taper(folder, file);
  } catch (const InputError& error) {
    block.refuse("measured", error.what());
  }
}

Taper read_taper(const TomlBlock& block, const std::filesystem::path& folder) {
  const toml::node* value = block.find("taper");
  if (value == nullptr) {
    block.refuse_missing("taper", std::string(kTaperForms) +
                                      "; or give measured_half, the reading between bottom lug and "
                                      "wiper with the knob at 5");
  }
  if (value->is_table()) {
    return read_taper_table(*block.optional_block("taper"), folder);
  }
  if (!value->is_string()) {
    block.refuse_type("taper", *value, kTaperForms);
  }
  try {
    return parse_taper(block.text("taper", kTaperForms));
  } catch (const InputError& error) {
    block.refuse("taper", error.what());
  }
}

/// The law through the reading. A name beside it only says whether the law is meant to be exponential; a letter says
/// nothing.
Taper read_law_through_half(const TomlBlock& block, const Pot& pot, double half_ohm) {
  bool exponential = false;
  if (const toml::node* value = block.find("taper")) {
    if (value->is_table()) {
      block.refuse("taper", "gives the law point by point, and measured_half gives it as well; take one of them out");
    }
    const std::string name = block.text("taper", kTaperForms);
    if (!is_taper_letter(name)) {
      try {
        exponential = parse_taper(name).name().rfind("ideal", 0) == 0;
      } catch (const InputError& error) {
        block.refuse("taper", error.what());
      }
    }
  }
  try {
    return law_from_half_reading(pot, half_ohm, exponential);
  } catch (const InputError& error) {
    block.refuse("measured_half", error.what());
  }
}

void read_dead_travel(const TomlBlock& block, Pot& pot) {
  const toml::node* value = block.find("dead_travel");
  if (value == nullptr) {
    return;
  }
  const toml::array* ends = value->as_array();
  if (ends == nullptr) {
    pot.dead_ccw_deg = block.number_of("dead_travel", *value, kDeadTravel);
    pot.dead_cw_deg = pot.dead_ccw_deg;
  } else {
    if (ends->size() != 2) {
      block.refuse("dead_travel",
                   "the list has " + std::to_string(ends->size()) +
                       " entries; wanted are two, for the end at 0 and the end at 10, or one number for both");
    }
    pot.dead_ccw_deg = block.number_of("dead_travel", (*ends)[0], kDeadTravel);
    pot.dead_cw_deg = block.number_of("dead_travel", (*ends)[1], kDeadTravel);
  }
  if (!(pot.dead_ccw_deg + pot.dead_cw_deg < pot.travel_deg)) {
    block.refuse("dead_travel", format_number(pot.dead_ccw_deg) + " and " + format_number(pot.dead_cw_deg) +
                                    " degrees take up the whole travel of " + format_number(pot.travel_deg) +
                                    " degrees; accepted is a sum below the travel");
  }
}

}  // namespace

std::vector<std::string_view> pot_keys() {
  return {"taper", "travel", "dead_travel", "end_resistance", "measured_total", "measured_half", "tolerance"};
}

Pot read_pot(const TomlBlock& block, std::string_view total_key, const std::filesystem::path& folder, const Pot* like) {
  Pot pot = like == nullptr ? Pot{} : *like;
  const std::optional<double> nominal_ohm = block.optional_quantity(total_key, Unit::ohm, kTotal);
  const std::optional<double> measured_ohm = block.optional_quantity("measured_total", Unit::ohm, kTotal);
  if (!nominal_ohm && !measured_ohm && like == nullptr) {
    block.refuse_missing(total_key,
                         "the total, from 10 ohm to 100M, as in \"500k\"; or measured_total, as read on a meter");
  }
  pot.total_ohm = measured_ohm.value_or(nominal_ohm.value_or(pot.total_ohm));
  pot.travel_deg = block.optional_number("travel", kTravel).value_or(pot.travel_deg);
  read_dead_travel(block, pot);
  pot.end_ohm = block.optional_quantity("end_resistance", Unit::ohm, kEnd).value_or(pot.end_ohm);
  if (!(2 * pot.end_ohm < pot.total_ohm)) {
    block.refuse("end_resistance", format_quantity(pot.end_ohm, Unit::ohm) +
                                       " at each end leaves nothing of the total " +
                                       format_quantity(pot.total_ohm, Unit::ohm) + "; accepted is below half of it");
  }
  if (block.has("tolerance")) pot.tolerance = block.tolerance();
  if (const std::optional<double> half_ohm = block.optional_quantity("measured_half", Unit::ohm, kReading)) {
    pot.taper = read_law_through_half(block, pot, *half_ohm);
  } else if (like == nullptr || block.has("taper")) {
    pot.taper = read_taper(block, folder);
  }
  return pot;
}

}  // namespace unsoldered
