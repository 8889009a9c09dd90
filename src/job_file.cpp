#include "src/job_file.h"

#include <cstdint>
#include <string>
#include <string_view>

#include "dsp/error.h"
#include "src/catalogue.h"
#include "src/clip_name.h"
#include "src/hookup_file.h"
#include "src/inside_folder.h"
#include "src/replace_file.h"
#include "src/take.h"
#include "src/toml_block.h"

namespace unsoldered {
namespace {

namespace fs = std::filesystem;

constexpr std::int64_t kVersion = 1;
constexpr NumberRange kDial{0, 10, ""};
constexpr NumberRange kBoost{0, kMostBoostLimitDb, "dB"};
constexpr NumberRange kSeconds{0, 1e6, "s"};
constexpr NumberRange kChannel{1, 8, ""};
constexpr std::size_t kMostSheetDials = 11;
constexpr std::string_view kLoudspeaker = "guitar loudspeaker";
constexpr std::string_view kLoudspeakerAsInCalls = "guitar-loudspeaker";

/// A path that stays in the job's folder; `elsewhere` is the next step for one that does not.
std::string file_in_folder(const TomlBlock& block, std::string_view key, std::string_view wanted,
                           const fs::path& folder, const std::string& elsewhere) {
  const std::string file = block.text(key, wanted);
  if (file.empty()) block.refuse(key, "the file name is empty; wanted is " + std::string(wanted));
  if (leads_out_of(folder, file)) {
    block.refuse(
        key, in_quotes(file) + " leads out of the folder of the job; accepted is a file in it or below; " + elsewhere);
  }
  return file;
}

void check_version(const TomlBlock& root) {
  const toml::node* version = root.find("unsoldered_job");
  if (version == nullptr) {
    root.refuse_missing("unsoldered_job", "unsoldered_job = 1, by which a job file is known; is this the right file?");
  }
  const auto* number = version->as_integer();
  if (number == nullptr) {
    root.refuse_type("unsoldered_job", *version, "the version of the job format, 1");
  }
  if (number->get() != kVersion) {
    root.refuse("unsoldered_job", "version " + std::to_string(number->get()) +
                                      " of the job format is not known here; accepted is 1, so a later version of "
                                      "Unsoldered may have written this job");
  }
}

JobFor read_for(const TomlBlock& block) {
  block.allow_only({"reference", "instrument", "text"});
  return {block.optional_text("reference").value_or(""), block.optional_text("instrument").value_or(""),
          block.optional_text("text").value_or("")};
}

JobRecordedThrough read_recorded_through(const TomlBlock& take, const fs::path& folder) {
  constexpr std::string_view key = "recorded_through";
  JobRecordedThrough recorded;
  const toml::node* value = take.find(key);
  if (value->is_string()) {
    const std::string word = take.text(key, "");
    if (word == "instrument") {
      recorded.kind = RecordedThroughKind::instrument;
    } else if (word != "nothing") {
      take.refuse(key, in_quotes(word) +
                           " is not known; accepted are \"nothing\", \"instrument\" and { hookup = "
                           "\"x.hookup.toml\", dial = 10, boost_limit_db = 24 }");
    }
    return recorded;
  }
  if (!value->is_table()) {
    take.refuse_type(key, *value, "\"nothing\", \"instrument\" or { hookup = \"x.hookup.toml\", dial = 10 }");
  }
  const TomlBlock block = *take.optional_block(key);
  block.allow_only({"hookup", "dial", "boost_limit_db"});
  recorded.kind = RecordedThroughKind::hookup;
  recorded.hookup_file =
      file_in_folder(block, "hookup", "a hookup file in the folder of the job", folder, "copy the hookup there");
  recorded.dial = block.optional_number("dial", kDial).value_or(10);
  recorded.boost_limit_db = block.optional_number("boost_limit_db", kBoost).value_or(kUsualBoostLimitDb);
  return recorded;
}

JobHeardThrough read_heard_through(const TomlBlock& take, const fs::path& folder) {
  constexpr std::string_view key = "heard_through";
  JobHeardThrough heard;
  const toml::node* value = take.find(key);
  if (value == nullptr) return heard;
  if (value->is_string()) {
    const std::string word = take.text(key, "");
    if (word == kLoudspeaker || word == kLoudspeakerAsInCalls) {
      heard.kind = HeardThroughKind::loudspeaker;
    } else if (word != "nothing") {
      take.refuse(key, in_quotes(word) +
                           " is not known; accepted are \"nothing\", \"guitar loudspeaker\" and { impulse_response = "
                           "\"cab.wav\" }");
    }
    return heard;
  }
  if (!value->is_table()) {
    take.refuse_type(key, *value, "\"nothing\", \"guitar loudspeaker\" or { impulse_response = \"cab.wav\" }");
  }
  const TomlBlock block = *take.optional_block(key);
  block.allow_only({"impulse_response"});
  heard.kind = HeardThroughKind::impulse_response;
  heard.impulse_response =
      file_in_folder(block, "impulse_response", "a sound file in the folder of the job", folder, "copy the file there");
  return heard;
}

std::pair<double, double> read_loop(const TomlBlock& block) {
  constexpr std::string_view wanted = "the start and the end in seconds, as in [2.0, 14.0]";
  const toml::node* value = block.find("loop");
  const toml::array* ends = value->as_array();
  if (ends == nullptr || ends->size() != 2) {
    block.refuse_type("loop", *value, wanted);
  }
  const double from = block.number_of("loop", (*ends)[0], kSeconds);
  const double to = block.number_of("loop", (*ends)[1], kSeconds);
  if (!(from < to)) block.refuse("loop", "the end does not come after the start; wanted are " + std::string(wanted));
  return {from, to};
}

/// Which of file, built_in and live the take is: exactly one.
JobTake read_which_take(const TomlBlock& block, const fs::path& folder, const std::string& in_its_place) {
  constexpr std::string_view wanted = "one of file = \"riff.wav\", built_in = true and live = true";
  JobTake take;
  const bool built_in = block.optional_flag("built_in").value_or(false);
  const bool live = block.optional_flag("live").value_or(false);
  const bool file = block.has("file");
  if (!built_in && !live && !file) block.refuse_missing("file", std::string(wanted));
  if (built_in + live + file > 1) {
    block.refuse(live ? "live" : "built_in",
                 "stands beside another take; wanted is " + std::string(wanted) + ", so take the others out");
  }
  take.kind = file ? TakeKind::file : live ? TakeKind::live : TakeKind::built_in;
  if (file && in_its_place.empty()) {
    take.file = file_in_folder(block, "file", "a sound file in the folder of the job", folder,
                               "copy the take there, or name it on the command line: unsoldered render TAKE --job …");
  } else if (file) {
    take.file = block.text("file", "a sound file");
  }
  return take;
}

JobTake read_take(const TomlBlock& block, const fs::path& folder, const std::string& in_its_place) {
  block.allow_only({"file", "built_in", "live", "loop", "second_channel", "recorded_through", "heard_through"});
  JobTake take = read_which_take(block, folder, in_its_place);
  if (block.has("loop")) take.loop_seconds = read_loop(block);
  if (const std::optional<double> channel = block.optional_number("second_channel", kChannel)) {
    take.second_channel = static_cast<int>(*channel);
    if (*take.second_channel != *channel) block.refuse("second_channel", "a channel is a whole number from 1 to 8");
  }
  if (block.has("recorded_through")) take.recorded_through = read_recorded_through(block, folder);
  take.heard_through = read_heard_through(block, folder);
  return take;
}

std::vector<double> read_sheet_dials(const TomlBlock& block) {
  constexpr std::string_view key = "sheet_dials";
  const toml::node* value = block.find(key);
  if (value == nullptr) return JobSettings{}.sheet_dials;
  const std::string wanted = "1 to 11 dial positions, each once, as in [10, 8, 6, 4, 2]";
  const toml::array* list = value->as_array();
  if (list == nullptr) block.refuse_type(key, *value, wanted);
  if (list->empty() || list->size() > kMostSheetDials) {
    block.refuse(key, "the list has " + std::to_string(list->size()) + " entries; wanted are " + wanted);
  }
  std::vector<double> dials;
  for (const toml::node& entry : *list) {
    const double dial = block.number_of(key, entry, kDial);
    for (const double other : dials) {
      if (dial == other) block.refuse(key, "one position stands there twice; wanted are " + wanted);
    }
    dials.push_back(dial);
  }
  return dials;
}

JobSettings read_settings(const TomlBlock& block, std::size_t candidates) {
  block.allow_only({"selected", "one_knob", "match_loudness", "sheet_dials"});
  JobSettings settings;
  if (const std::optional<std::string> letter = block.optional_text("selected")) {
    const std::string last(1, candidate_letter(candidates - 1));
    if (letter->size() != 1 || (*letter)[0] < 'A' || (*letter)[0] > last[0]) {
      block.refuse("selected", in_quotes(*letter) + " is not a candidate of this job; accepted is " +
                                   (candidates == 1 ? "\"A\"" : "a letter from \"A\" to \"" + last + "\"") +
                                   ", in the order of the [[candidate]] blocks");
    }
    settings.selected = static_cast<std::size_t>((*letter)[0] - 'A');
  }
  settings.one_knob = block.optional_flag("one_knob").value_or(settings.one_knob);
  settings.match_loudness = block.optional_flag("match_loudness").value_or(settings.match_loudness);
  settings.sheet_dials = read_sheet_dials(block);
  return settings;
}

/// The hookups written into the job, candidate by candidate (empty for one that names a file). They are taken out of
/// the document, so that what stands in them keeps its lines.
std::vector<toml::table> take_out_hookups(toml::table& root) {
  std::vector<toml::table> hookups;
  toml::array* list = root["candidate"].as_array();
  for (std::size_t i = 0; list != nullptr && i < list->size(); ++i) {
    hookups.emplace_back();
    toml::table* candidate = (*list)[i].as_table();
    toml::table* hookup = candidate == nullptr ? nullptr : (*candidate)["hookup"].as_table();
    if (hookup == nullptr) continue;
    for (auto&& [key, value] : *hookup) {
      value.visit([&, name = key.str()](auto& node) { hookups.back().insert_or_assign(name, std::move(node)); });
    }
  }
  return hookups;
}

JobCandidate read_candidate(const TomlBlock& block, toml::table inside, const std::string& job_name,
                            const fs::path& folder, const std::vector<std::string>& settings, char letter) {
  constexpr std::string_view wanted =
      "a hookup file in the folder of the job, or hookup = { … } with the hookup itself";
  block.allow_only({"name", "hookup_file", "hookup", "dial"});
  JobCandidate candidate;
  candidate.name = block.optional_text("name").value_or("");
  candidate.dial = block.optional_number("dial", kDial).value_or(10);
  if (block.has("hookup") && block.has("hookup_file")) {
    block.refuse("hookup", "stands beside hookup_file, and both give the hookup; take one of them out");
  }
  if (block.has("hookup")) {
    const toml::node* value = block.find("hookup");
    if (!value->is_table()) block.refuse_type("hookup", *value, wanted);
    candidate.table = inside;
    TomlDocument document{job_name, std::move(inside)};
    try {
      apply_settings_and_catalogue(document, settings);
      candidate.inputs = measured_files(document.root, folder);
      candidate.hookup = hookup_from(document, folder);
    } catch (const InputError& error) {
      throw InputError(std::string(error.what()) + " (in the hookup of candidate " + letter + ")");
    }
    return candidate;
  }
  candidate.hookup_file = file_in_folder(block, "hookup_file", wanted, folder,
                                         "copy the hookup there, or write it into the job as hookup = { … }");
  const fs::path file = folder / candidate.hookup_file;
  std::error_code error;
  if (!fs::exists(file, error)) {
    block.refuse("hookup_file",
                 in_quotes(candidate.hookup_file) + ": there is no such file; give " + std::string(wanted));
  }
  candidate.inputs = files_of_hookup(file, settings);
  candidate.hookup = read_hookup(file, settings);
  return candidate;
}

}  // namespace

char candidate_letter(std::size_t index) { return static_cast<char>('A' + static_cast<int>(index)); }

std::string candidate_stem(const Job& job, std::size_t index) {
  const JobCandidate& candidate = job.candidates.at(index);
  std::string name = candidate.name;
  if (name.empty()) {
    name = candidate.hookup_file.empty() ? candidate.hookup.title : hookup_stem(candidate.hookup_file);
  }
  return std::string(1, candidate_letter(index)) + (name.empty() ? "" : "-" + name);
}

fs::path path_in_job(const Job& job, const std::string& written) { return job.file.parent_path() / written; }

Job read_job(const fs::path& file, const JobCall& call) {
  const fs::path folder = file.parent_path();
  TomlDocument document = parse_toml(read_small_file(file), file.string());
  std::vector<toml::table> inside = take_out_hookups(document.root);
  const TomlBlock root(document);
  check_version(root);
  root.allow_only({"unsoldered_job", "title", "for", "take", "settings", "candidate"});

  Job job;
  job.file = file;
  job.title = root.optional_text("title").value_or("");
  if (const std::optional<TomlBlock> block = root.optional_block("for")) job.customer = read_for(*block);
  job.take = read_take(root.block("take", "[take] with file = \"riff.wav\", built_in = true or live = true"), folder,
                       call.take);
  const std::vector<TomlBlock> blocks = root.blocks("candidate");
  if (blocks.empty()) {
    throw InputError(document.name +
                     ": block [[candidate]] is missing; wanted are 1 to 8 of them, each with hookup_file or hookup");
  }
  if (blocks.size() > kMostCandidates) {
    root.refuse("candidate", "there are " + std::to_string(blocks.size()) +
                                 " candidates; accepted are up to 8, lettered A to H; make two jobs of it");
  }
  for (std::size_t i = 0; i < blocks.size(); ++i) {
    job.candidates.push_back(
        read_candidate(blocks[i], std::move(inside[i]), document.name, folder, call.settings, candidate_letter(i)));
    Hookup& hookup = job.candidates.back().hookup;
    if (hookup.second && job.take.second_channel) hookup.second_channel = job.take.second_channel;
  }
  if (const std::optional<TomlBlock> block = root.optional_block("settings")) {
    job.settings = read_settings(*block, blocks.size());
  }
  if (!call.take.empty()) {
    job.take.kind = call.take == kBuiltInTake ? TakeKind::built_in : TakeKind::file;
    job.take.file = job.take.kind == TakeKind::file ? fs::absolute(call.take).string() : "";
  }
  return job;
}

void write_job(const Job& job, const fs::path& file) { replace_file(file, job_text(job)); }

}  // namespace unsoldered
