// Job files: a take, the hookups compared (candidates A to H), knob positions, settings and who it is for.
//
// Paths are relative to the folder of the job file and may not leave it, not by "..", an absolute path or a link; a
// take from elsewhere is named on the command line, which counts as opened by the user.
#pragma once

#include <filesystem>
#include <optional>
#include <string>
#include <utility>
#include <vector>

#include "dsp/hookup.h"
#include "src/recorded_through.h"
#include "src/toml_document.h"

namespace unsoldered {

inline constexpr std::size_t kMostCandidates = 8;

struct JobFor {
  std::string reference;
  std::string instrument;
  std::string text;
};

enum class TakeKind { file, built_in, live };
enum class RecordedThroughKind { nothing, instrument, hookup };
enum class HeardThroughKind { nothing, loudspeaker, impulse_response };

/// What the take already passed when it was recorded.
struct JobRecordedThrough {
  RecordedThroughKind kind = RecordedThroughKind::nothing;
  std::string hookup_file;  // kind == hookup; as written
  double dial = 10;
  double boost_limit_db = kUsualBoostLimitDb;
};

/// What comes after the load when listening.
struct JobHeardThrough {
  HeardThroughKind kind = HeardThroughKind::nothing;
  std::string impulse_response;  // kind == impulse_response; as written
};

struct JobTake {
  TakeKind kind = TakeKind::built_in;
  std::string file;  // kind == file; as written
  std::optional<std::pair<double, double>> loop_seconds;
  std::optional<int> second_channel;                   // from 1; goes to every candidate with a second source
  std::optional<JobRecordedThrough> recorded_through;  // empty: nothing said
  JobHeardThrough heard_through;
};

struct JobSettings {
  std::size_t selected = 0;  // index of a candidate
  bool one_knob = true;
  bool match_loudness = false;
  std::vector<double> sheet_dials = {10, 8, 6, 4, 2};
};

struct JobCandidate {
  std::string name;         // as written; may be empty
  std::string hookup_file;  // as written; empty: the hookup stands in the job itself
  toml::table table;        // that hookup as written, its catalogue names not yet looked up
  double dial = 10;

  Hookup hookup;                              // read and checked
  std::vector<std::filesystem::path> inputs;  // the files it was read from
};

struct Job {
  std::string title;
  JobFor customer;
  JobTake take;
  JobSettings settings;
  std::vector<JobCandidate> candidates;  // 1 to kMostCandidates
  std::filesystem::path file;            // where it was read from
};

/// 'A' for the first.
char candidate_letter(std::size_t index);

/// "A-500k-audio", for the names of clips: the letter and the name; without a name the hookup file's, or the title of
/// the hookup in the job.
std::string candidate_stem(const Job& job, std::size_t index);

/// A path as written in the job, from the current folder.
std::filesystem::path path_in_job(const Job& job, const std::string& written);

/// What the command line says over the job.
struct JobCall {
  std::string take;                   // in place of the job's own, which then may be anywhere; empty: the job's
  std::vector<std::string> settings;  // --set, laid over every candidate
};

/// Reads and checks a job and the hookups it names. Throws InputError with file, line, key, value and what is accepted.
Job read_job(const std::filesystem::path& file, const JobCall& call = {});

/// The job as a file, values as they are now; what is as usual is written out, comments are lost.
std::string job_text(const Job& job);

/// Replaces `file` at one stroke. Throws CannotError.
void write_job(const Job& job, const std::filesystem::path& file);

}  // namespace unsoldered
