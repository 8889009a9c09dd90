// A job as the text of a file (declared in job_file.h).
#include <array>
#include <charconv>
#include <sstream>

#include "src/job_file.h"

namespace unsoldered {
namespace {

/// The shortest text that reads back as the same number.
std::string number(double value) {
  std::array<char, 32> text{};
  return {text.data(), std::to_chars(text.data(), text.data() + text.size(), value).ptr};
}

template <typename Node>
std::string formatted(const Node& node) {
  std::ostringstream text;
  text << toml::toml_formatter{node, toml::format_flags::none};
  return text.str();
}

std::string quoted(const std::string& text) { return formatted(toml::value<std::string>(text)); }

/// A value in one line, whatever the way it was written in: an entry of [[candidate]] has no blocks of its own.
std::string one_line(const toml::node& node) {
  std::string out;
  if (const toml::table* table = node.as_table()) {
    for (const auto& [key, value] : *table) {
      out += (out.empty() ? "" : ", ") + std::string(key.str()) + " = " + one_line(value);
    }
    return out.empty() ? "{}" : "{ " + out + " }";
  }
  if (const toml::array* list = node.as_array()) {
    for (const toml::node& entry : *list) out += (out.empty() ? "" : ", ") + one_line(entry);
    return "[" + out + "]";
  }
  node.visit([&](const auto& value) {
    if constexpr (!toml::is_table<decltype(value)> && !toml::is_array<decltype(value)>) out = formatted(value);
  });
  return out;
}

std::string flag(bool value) { return value ? "true" : "false"; }

std::string recorded_text(const JobRecordedThrough& recorded) {
  switch (recorded.kind) {
    case RecordedThroughKind::nothing:
      return "\"nothing\"";
    case RecordedThroughKind::instrument:
      return "\"instrument\"";
    case RecordedThroughKind::hookup:
      break;
  }
  return "{ hookup = " + quoted(recorded.hookup_file) + ", dial = " + number(recorded.dial) +
         ", boost_limit_db = " + number(recorded.boost_limit_db) + " }";
}

std::string heard_text(const JobHeardThrough& heard) {
  switch (heard.kind) {
    case HeardThroughKind::nothing:
      return "\"nothing\"";
    case HeardThroughKind::loudspeaker:
      return "\"guitar loudspeaker\"";
    case HeardThroughKind::impulse_response:
      break;
  }
  return "{ impulse_response = " + quoted(heard.impulse_response) + " }";
}

std::string take_text(const JobTake& take) {
  std::string text = "\n[take]\n";
  switch (take.kind) {
    case TakeKind::file:
      text += "file = " + quoted(take.file) + "\n";
      break;
    case TakeKind::built_in:
      text += "built_in = true\n";
      break;
    case TakeKind::live:
      text += "live = true\n";
      break;
  }
  if (take.loop_seconds) {
    text += "loop = [" + number(take.loop_seconds->first) + ", " + number(take.loop_seconds->second) + "]\n";
  }
  if (take.second_channel) text += "second_channel = " + std::to_string(*take.second_channel) + "\n";
  if (take.recorded_through) text += "recorded_through = " + recorded_text(*take.recorded_through) + "\n";
  return text + "heard_through = " + heard_text(take.heard_through) + "\n";
}

std::string settings_text(const JobSettings& settings) {
  std::string dials;
  for (const double dial : settings.sheet_dials) dials += (dials.empty() ? "" : ", ") + number(dial);
  return "\n[settings]\nselected = \"" + std::string(1, candidate_letter(settings.selected)) +
         "\"\none_knob = " + flag(settings.one_knob) + "\nmatch_loudness = " + flag(settings.match_loudness) +
         "\nsheet_dials = [" + dials + "]\n";
}

std::string candidate_text(const JobCandidate& candidate) {
  std::string text = "\n[[candidate]]\n";
  if (!candidate.name.empty()) text += "name = " + quoted(candidate.name) + "\n";
  text += candidate.hookup_file.empty() ? "hookup = " + one_line(candidate.table) + "\n"
                                        : "hookup_file = " + quoted(candidate.hookup_file) + "\n";
  return text + "dial = " + number(candidate.dial) + "\n";
}

}  // namespace

std::string job_text(const Job& job) {
  std::string text =
      "unsoldered_job = 1\ntitle = " + quoted(job.title) + "\n\n[for]\nreference = " + quoted(job.customer.reference) +
      "\ninstrument = " + quoted(job.customer.instrument) + "\ntext = " + quoted(job.customer.text) + "\n";
  text += take_text(job.take) + settings_text(job.settings);
  for (const JobCandidate& candidate : job.candidates) text += candidate_text(candidate);
  return text;
}

}  // namespace unsoldered
