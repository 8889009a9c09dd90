#include "src/hookup_measured.h"

#include <algorithm>
#include <optional>
#include <system_error>
#include <vector>

#include "dsp/error.h"
#include "dsp/quantity.h"
#include "src/inside_folder.h"
#include "src/number_text.h"
#include "src/toml_document.h"

namespace unsoldered {
namespace {

constexpr std::size_t kMostPoints = 10000;

[[noreturn]] void refuse(const std::string& place, const std::string& why) {
  throw InputError(place + ": " + why +
                   "; wanted are lines \"travel,share\", travel 0 to 1, share 0 to 1 or readings in ohm");
}

std::optional<double> reading(std::string_view text) {
  if (const std::optional<double> number = parse_number(text)) {
    return number;
  }
  try {
    return parse_quantity(text, Unit::ohm);
  } catch (const InputError&) {
    return std::nullopt;
  }
}

/// One line of the file; empty for a line to pass over.
std::optional<TaperPoint> parse_line(std::string_view line, bool may_be_header, const std::string& place) {
  const std::string_view bare = trimmed(line);
  if (bare.empty() || bare.front() == '#') {
    return std::nullopt;
  }
  const std::size_t comma = bare.find(',');
  if (bare.find(';') != std::string_view::npos ||
      bare.find(',', comma + (comma == std::string_view::npos ? 0 : 1)) != std::string_view::npos) {
    refuse(place, in_quotes(bare) +
                      " has more than one separator (the decimal sign is a point, columns are separated by a "
                      "comma)");
  }
  if (comma == std::string_view::npos) {
    refuse(place, in_quotes(bare) + " is one column");
  }
  const std::optional<double> travel = parse_number(bare.substr(0, comma));
  const std::optional<double> share = reading(trimmed(bare.substr(comma + 1)));
  if (!travel && !share && may_be_header) {
    return std::nullopt;
  }
  if (!travel || !share) {
    refuse(place, in_quotes(bare) + " is not a pair of numbers");
  }
  return TaperPoint{*travel, *share};
}

}  // namespace

Taper parse_measured_taper(std::string_view csv, const std::string& name) {
  std::vector<TaperPoint> points;
  std::size_t number = 0;
  bool content_seen = false;
  if (csv.substr(0, 3) == "\xEF\xBB\xBF") {
    csv.remove_prefix(3);  // spreadsheets put a byte order mark there
  }
  while (!csv.empty()) {
    const std::size_t end = std::min(csv.find('\n'), csv.size());
    const std::string_view line = csv.substr(0, end);
    csv.remove_prefix(std::min(end + 1, csv.size()));
    const std::string place = name + ":" + std::to_string(++number);
    if (const std::optional<TaperPoint> point = parse_line(line, !content_seen, place)) {
      points.push_back(*point);
    }
    content_seen = content_seen || (!trimmed(line).empty() && trimmed(line).front() != '#');
    if (points.size() > kMostPoints) {
      refuse(place, "there are more than 10000 points");
    }
  }
  if (points.size() < 2) {
    refuse(name, "the file has " + std::to_string(points.size()) + " points, at least two are needed");
  }
  const double first = points.front().r;
  const double span = points.back().r - first;
  if (points.back().r > 1) {
    if (!(span > 0)) {
      refuse(name, "the last reading is not above the first");
    }
    for (TaperPoint& point : points) {
      point.r = (point.r - first) / span;
    }
  }
  try {
    return Taper::measured(std::move(points)).named("{ measured = \"" + name + "\" }");
  } catch (const InputError& error) {
    throw InputError(name + ": " + error.what());
  }
}

Taper read_measured_taper(const std::filesystem::path& folder, const std::string& file) {
  if (file.empty()) {
    throw InputError("no file is named; give a CSV file in the folder of the hookup file");
  }
  if (leads_out_of(folder, file)) {
    throw InputError(in_quotes(file) + " leads out of the folder of the hookup file; put the measurement beside it");
  }
  return parse_measured_taper(read_small_file(folder / file), file);
}

}  // namespace unsoldered
