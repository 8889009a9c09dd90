#include "src/clip_list.h"

#include <cmath>
#include <nlohmann/json.hpp>

#include "src/number_text.h"

namespace unsoldered {
namespace {

/// RFC 4180: quoted where needed, quotes doubled.
std::string csv_field(const std::string& text) {
  if (text.find_first_of(",\"\r\n") == std::string::npos) return text;
  std::string quoted = "\"";
  for (const char letter : text) {
    if (letter == '"') quoted += '"';
    quoted += letter;
  }
  return quoted + '"';
}

/// File names need not be UTF-8; what is not becomes the replacement character.
std::string json_string(const std::string& text) {
  return nlohmann::json(text).dump(-1, ' ', false, nlohmann::json::error_handler_t::replace);
}

std::string json_number(double value) { return std::isfinite(value) ? format_number(value) : "null"; }

std::string dial_text(const ClipRow& clip, const char* turn) { return clip.dial ? format_number(*clip.dial) : turn; }

}  // namespace

std::string clips_csv(const std::vector<ClipRow>& clips) {
  std::string csv = "file,hookup,dial,gain_db,peak_dbfs,peak_dbtp,loudness_lufs\n";
  for (const ClipRow& clip : clips) {
    csv += csv_field(clip.file) + ',' + csv_field(clip.hookup) + ',' + dial_text(clip, "turn") + ',' +
           format_number(clip.gain_db) + ',' + format_number(clip.peak_dbfs) + ",,\n";
  }
  return csv;
}

std::string clips_json(const std::vector<ClipRow>& clips) {
  std::string json = "[";
  for (const ClipRow& clip : clips) {
    json += json.size() > 1 ? ",\n " : "\n ";
    json += "{\"file\": " + json_string(clip.file) + ", \"hookup\": " + json_string(clip.hookup) +
            ", \"dial\": " + dial_text(clip, "\"turn\"") + ", \"gain_db\": " + json_number(clip.gain_db) +
            ", \"peak_dbfs\": " + json_number(clip.peak_dbfs) + ", \"peak_dbtp\": null, \"loudness_lufs\": null}";
  }
  return json + "\n]\n";
}

}  // namespace unsoldered
