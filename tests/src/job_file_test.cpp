// Job files: the whole format is read, refused with place and reason, and written back as it was.
#include "src/job_file.h"

#include <sys/stat.h>
#include <unistd.h>

#include <filesystem>
#include <fstream>
#include <random>
#include <string>
#include <vector>

#include "dsp/error.h"
#include "tests/catch.h"

using Catch::Matchers::ContainsSubstring;
using Catch::Matchers::WithinRel;
using namespace unsoldered;

namespace {

namespace fs = std::filesystem;

const std::string kHookup = R"(title = "Loud"
source = "single coil"
volume = "500k audio"
load = "valve amplifier input"
)";

const std::string kJob = R"(unsoldered_job = 1
title = "Dull at 7: bridge volume"
[for]
reference = "24-117"
instrument = "short-scale bass"
text = "Which of these do you like with your own strings?"
[take]
file = "riff.wav"
loop = [2.0, 14.0]
recorded_through = "instrument"
heard_through = "nothing"
[settings]
selected = "B"
one_knob = false
match_loudness = true
sheet_dials = [10, 7.5, 0]
[[candidate]]
hookup_file = "loud.hookup.toml"
dial = 7
[[candidate]]
name = "With bleed"
dial = 6.5
hookup = { source = { kind = "line", resistance = "100" }, volume = { resistance = "10k", taper = "linear" }, load = { resistance = "47k" } }
)";

class Folder {
 public:
  Folder()
      : path_(fs::temp_directory_path() /
              ("unsoldered-job-" + std::to_string(::getpid()) + "-" + std::to_string(std::random_device{}()))) {
    fs::create_directories(path_ / "bench");
    write("bench/loud.hookup.toml", kHookup);
  }
  Folder(const Folder&) = delete;
  Folder& operator=(const Folder&) = delete;
  ~Folder() {
    std::error_code ignored;
    fs::remove_all(path_, ignored);
  }
  fs::path write(const std::string& name, const std::string& text) const {
    fs::create_directories((path_ / name).parent_path());
    std::ofstream(path_ / name, std::ios::binary) << text;
    return path_ / name;
  }
  const fs::path& path() const { return path_; }

  Job read(const std::string& text, const JobCall& call = {}) const {
    return read_job(write("bench/x.job.toml", text), call);
  }
  std::string refusal(const std::string& text, const JobCall& call = {}) const {
    try {
      read(text, call);
    } catch (const InputError& error) {
      return error.what();
    }
    return "accepted";
  }

 private:
  fs::path path_;
};

std::string replaced(std::string text, const std::string& from, const std::string& to) {
  const std::size_t at = text.find(from);
  if (at == std::string::npos) throw std::logic_error("no " + from);
  return text.replace(at, from.size(), to);
}

}  // namespace

TEST_CASE("The whole job format is read") {
  const Folder folder;
  const Job job = folder.read(kJob);
  CHECK(job.title == "Dull at 7: bridge volume");
  CHECK(job.customer.reference == "24-117");
  CHECK(job.customer.instrument == "short-scale bass");
  CHECK(job.customer.text == "Which of these do you like with your own strings?");
  CHECK(job.take.kind == TakeKind::file);
  CHECK(job.take.file == "riff.wav");
  CHECK(job.take.loop_seconds == std::pair(2.0, 14.0));
  REQUIRE(job.take.recorded_through.has_value());
  CHECK(job.take.recorded_through->kind == RecordedThroughKind::instrument);
  CHECK(job.take.heard_through.kind == HeardThroughKind::nothing);
  CHECK(job.settings.selected == 1);
  CHECK_FALSE(job.settings.one_knob);
  CHECK(job.settings.match_loudness);
  CHECK(job.settings.sheet_dials == std::vector<double>{10, 7.5, 0});
  REQUIRE(job.candidates.size() == 2);
  CHECK(job.candidates[0].dial == 7);
  CHECK(job.candidates[0].hookup.title == "Loud");
  REQUIRE(job.candidates[0].inputs.size() == 1);
  CHECK(job.candidates[0].inputs[0].filename() == "loud.hookup.toml");
  CHECK(job.candidates[1].dial == 6.5);
  CHECK_THAT(job.candidates[1].hookup.load.resistance_ohm, WithinRel(47e3, 1e-12));
  CHECK(candidate_stem(job, 0) == "A-loud");
  CHECK(candidate_stem(job, 1) == "B-With bleed");
  CHECK(path_in_job(job, job.take.file) == folder.path() / "bench/riff.wav");
}

TEST_CASE("What a job leaves out is as usual") {
  const Folder folder;
  const Job job = folder.read(R"(unsoldered_job = 1
[take]
built_in = true
[[candidate]]
hookup = { source = "single coil", volume = "500k audio", load = "line input" }
)");
  CHECK(job.take.kind == TakeKind::built_in);
  CHECK_FALSE(job.take.recorded_through.has_value());
  CHECK_FALSE(job.take.loop_seconds.has_value());
  CHECK(job.settings.selected == 0);
  CHECK(job.settings.one_knob);
  CHECK_FALSE(job.settings.match_loudness);
  CHECK(job.settings.sheet_dials == std::vector<double>{10, 8, 6, 4, 2});
  CHECK(job.candidates[0].dial == 10);
  CHECK(candidate_stem(job, 0) == "A");
}

TEST_CASE("Recorded through and heard through take a file of the job's folder") {
  const Folder folder;
  const Job job = folder.read(
      replaced(replaced(kJob, "\"instrument\"", "{ hookup = \"loud.hookup.toml\", dial = 8, boost_limit_db = 18 }"),
               "heard_through = \"nothing\"", "heard_through = { impulse_response = \"cabs/one.wav\" }"));
  REQUIRE(job.take.recorded_through.has_value());
  CHECK(job.take.recorded_through->kind == RecordedThroughKind::hookup);
  CHECK(job.take.recorded_through->hookup_file == "loud.hookup.toml");
  CHECK(job.take.recorded_through->dial == 8);
  CHECK(job.take.recorded_through->boost_limit_db == 18);
  CHECK(job.take.heard_through.kind == HeardThroughKind::impulse_response);
  CHECK(job.take.heard_through.impulse_response == "cabs/one.wav");
  const Job speaker =
      folder.read(replaced(kJob, "heard_through = \"nothing\"", "heard_through = \"guitar loudspeaker\""));
  CHECK(speaker.take.heard_through.kind == HeardThroughKind::loudspeaker);
}

TEST_CASE("A job written and read again is the same job") {
  const Folder folder;
  const std::vector<std::string> jobs = {
      kJob,
      replaced(kJob, "\"instrument\"", "{ hookup = \"loud.hookup.toml\", dial = 8.25, boost_limit_db = 18 }"),
      replaced(kJob, "recorded_through = \"instrument\"\n", "second_channel = 2\n"),
      replaced(kJob, "heard_through = \"nothing\"",
               "heard_through = { impulse_response = \"a \\\"quoted\\\" name.wav\" }"),
      replaced(kJob, "file = \"riff.wav\"", "live = true"),
      replaced(kJob, "taper = \"linear\"",
               "taper = { sections = [[0, 0], [0.6, 0.2], [1, 1]] }, dead_travel = [15, 7.5]"),
      replaced(kJob, "load = { resistance = \"47k\" }",
               "load = \"line input\", tone = { catalogue = \"500k audio, 22 nF\", dial = 0.1, no_load = true }"),
      replaced(kJob, "24-117", "caf\\u00e9 \\\\ \xC2\xB5"),
  };
  for (const std::string& text : jobs) {
    const Job job = folder.read(text);
    const fs::path copy = folder.path() / "bench/copy.job.toml";
    write_job(job, copy);
    const Job again = read_job(copy);
    INFO(job_text(job));
    CHECK(job_text(again) == job_text(job));
    CHECK(again.title == job.title);
    CHECK(again.customer.reference == job.customer.reference);
    CHECK(again.take.kind == job.take.kind);
    CHECK(again.take.file == job.take.file);
    CHECK(again.take.loop_seconds == job.take.loop_seconds);
    CHECK(again.take.second_channel == job.take.second_channel);
    CHECK(again.take.recorded_through.has_value() == job.take.recorded_through.has_value());
    CHECK(again.take.heard_through.impulse_response == job.take.heard_through.impulse_response);
    CHECK(again.settings.selected == job.settings.selected);
    CHECK(again.settings.one_knob == job.settings.one_knob);
    CHECK(again.settings.match_loudness == job.settings.match_loudness);
    CHECK(again.settings.sheet_dials == job.settings.sheet_dials);
    REQUIRE(again.candidates.size() == job.candidates.size());
    for (std::size_t i = 0; i < job.candidates.size(); ++i) {
      CHECK(again.candidates[i].name == job.candidates[i].name);
      CHECK(again.candidates[i].hookup_file == job.candidates[i].hookup_file);
      CHECK(again.candidates[i].dial == job.candidates[i].dial);
      CHECK(again.candidates[i].table == job.candidates[i].table);
    }
  }
}

TEST_CASE("Writing a job replaces the file at one stroke and keeps its permissions") {
  const Folder folder;
  const Job job = folder.read(kJob);
  const fs::path target = folder.write("bench/old.job.toml", "old");
  fs::permissions(target, fs::perms::owner_read | fs::perms::owner_write);
  fs::create_symlink("old.job.toml", folder.path() / "bench/link.job.toml");
  write_job(job, folder.path() / "bench/link.job.toml");
  CHECK(fs::is_symlink(folder.path() / "bench/link.job.toml"));
  CHECK(read_job(target).title == job.title);
  CHECK(fs::status(target).permissions() == (fs::perms::owner_read | fs::perms::owner_write));
  std::size_t files = 0;
  for (const auto& entry : fs::directory_iterator(folder.path() / "bench")) {
    if (entry.exists()) ++files;
  }
  CHECK(files == 4);  // hookup, job, old, link: no temporary file is left
  CHECK_THROWS_AS(write_job(job, folder.path() / "nowhere/x.job.toml"), CannotError);
}

TEST_CASE("Paths of a job may not leave its folder") {
  const Folder folder;
  folder.write("outside.hookup.toml", kHookup);
  folder.write("bench/below/in.hookup.toml", kHookup);
  fs::create_symlink("../outside.hookup.toml", folder.path() / "bench/out-link.hookup.toml");
  fs::create_symlink("below/in.hookup.toml", folder.path() / "bench/in-link.hookup.toml");
  const auto with_file = [&](const std::string& file) { return replaced(kJob, "loud.hookup.toml", file); };
  CHECK(folder.refusal(with_file("below/in.hookup.toml")) == "accepted");
  CHECK(folder.refusal(with_file("below/../loud.hookup.toml")) == "accepted");
  CHECK(folder.refusal(with_file("in-link.hookup.toml")) == "accepted");
  const std::vector<std::string> outside = {"../outside.hookup.toml", "below/../../outside.hookup.toml",
                                            (folder.path() / "outside.hookup.toml").string(), "out-link.hookup.toml",
                                            "/etc/passwd"};
  for (const std::string& file : outside) {
    CHECK_THAT(folder.refusal(with_file(file)), ContainsSubstring("x.job.toml:18") && ContainsSubstring(file) &&
                                                    ContainsSubstring("leads out of the folder") &&
                                                    ContainsSubstring("copy the hookup there"));
  }
  CHECK_THAT(folder.refusal(replaced(kJob, "riff.wav", "../riff.wav")),
             ContainsSubstring("take.file") && ContainsSubstring("on the command line"));
  CHECK_THAT(folder.refusal(replaced(kJob, "\"instrument\"", "{ hookup = \"../outside.hookup.toml\" }")),
             ContainsSubstring("take.recorded_through.hookup"));
  CHECK_THAT(folder.refusal(
                 replaced(kJob, "heard_through = \"nothing\"", "heard_through = { impulse_response = \"/x.wav\" }")),
             ContainsSubstring("take.heard_through.impulse_response"));
  // A take that the user names is opened by the user, wherever it is.
  const JobCall opened{(folder.path() / "mine.wav").string(), {}};
  const Job job = folder.read(replaced(kJob, "riff.wav", "../riff.wav"), opened);
  CHECK(path_in_job(job, job.take.file) == folder.path() / "mine.wav");
}

TEST_CASE("A job that cannot be is refused with file, line, key, value and what is accepted") {
  struct Case {
    std::string text;
    std::vector<std::string> words;
  };
  const std::string candidate = "[[candidate]]\nhookup_file = \"loud.hookup.toml\"\n";
  std::string nine = kJob.substr(0, kJob.find("[[candidate]]"));
  for (int i = 0; i < 9; ++i) nine += candidate;
  const Folder folder;
  const std::vector<Case> cases = {
      {replaced(kJob, "unsoldered_job = 1\n", ""), {"unsoldered_job", "missing", "unsoldered_job = 1"}},
      {replaced(kJob, "unsoldered_job = 1", "unsoldered_job = 2"), {":1:", "version 2", "accepted is 1"}},
      {replaced(kJob, "unsoldered_job = 1", "unsoldered_job = \"1\""), {":1:", "cannot stand here"}},
      {replaced(kJob, "[settings]", "[setting]"), {"setting", "\"settings\" meant"}},
      {replaced(kJob, "one_knob", "one_nob"), {"settings.one_nob", "\"one_knob\" meant"}},
      {kJob.substr(0, kJob.find("[[candidate]]")), {"[[candidate]] is missing", "hookup_file or hookup"}},
      {nine, {"9 candidates", "up to 8", "two jobs"}},
      {replaced(kJob, "file = \"riff.wav\"\n", ""), {":7:", "take.file", "missing", "built_in = true"}},
      {replaced(kJob, "file = \"riff.wav\"\n", "built_in = false\n"), {"take.file", "missing"}},
      {replaced(kJob, "file = \"riff.wav\"\n", "file = \"riff.wav\"\nlive = true\n"),
       {":9:", "take.live", "another take"}},
      {replaced(kJob, "file = \"riff.wav\"", "file = \"\""), {":8:", "empty"}},
      {replaced(kJob, "[2.0, 14.0]", "[14.0, 2.0]"), {":9:", "take.loop", "after the start"}},
      {replaced(kJob, "[2.0, 14.0]", "[2.0]"), {"take.loop", "[2.0, 14.0]"}},
      {replaced(kJob, "[2.0, 14.0]", "[-1, 14.0]"), {"take.loop", "-1", "0 to 1000000 s"}},
      {replaced(kJob, "\"instrument\"", "\"instruments\""), {":10:", "instruments", "\"instrument\""}},
      {replaced(kJob, "\"instrument\"", "{ dial = 7 }"), {"recorded_through.hookup", "missing"}},
      {replaced(kJob, "\"instrument\"", "{ hookup = \"loud.hookup.toml\", dial = 11 }"), {"11", "0 to 10"}},
      {replaced(kJob, "heard_through = \"nothing\"", "heard_through = \"loudspeaker\""),
       {":11:", "guitar loudspeaker"}},
      {replaced(kJob, "selected = \"B\"", "selected = \"C\""), {":13:", "\"C\"", "\"A\" to \"B\""}},
      {replaced(kJob, "selected = \"B\"", "selected = \"b\""), {":13:", "\"b\""}},
      {replaced(kJob, "[10, 7.5, 0]", "[10, 7.5, 10]"), {":16:", "twice"}},
      {replaced(kJob, "[10, 7.5, 0]", "[]"), {":16:", "0 entries", "1 to 11"}},
      {replaced(kJob, "[10, 7.5, 0]", "[12]"), {":16:", "12", "0 to 10"}},
      {replaced(kJob, "dial = 7\n", "dial = 70\n"), {":19:", "candidate.0.dial", "70", "0 to 10"}},
      {replaced(kJob, "hookup_file = \"loud.hookup.toml\"\n", ""), {"candidate.0.hookup_file", "missing"}},
      {replaced(kJob, "loud.hookup.toml", "gone.hookup.toml"), {":18:", "gone.hookup.toml", "no such file"}},
      {replaced(kJob, "name = \"With bleed\"", "hookup_file = \"loud.hookup.toml\""), {"candidate.1.hookup", "beside"}},
      {replaced(kJob, "taper = \"linear\"", "taper = \"linaer\""), {"x.job.toml:23", "volume.taper", "linaer"}},
      {replaced(kJob, "load = { resistance = \"47k\" }", "load = \"lin input\""),
       {"x.job.toml:23", "\"line input\" meant"}},
  };
  for (const Case& one : cases) {
    const std::string message = folder.refusal(one.text);
    CHECK_THAT(message, ContainsSubstring("x.job.toml"));
    for (const std::string& word : one.words) CHECK_THAT(message, ContainsSubstring(word));
  }
}

TEST_CASE("The job's second channel goes to the candidates with a second source") {
  const Folder folder;
  const std::string both =
      "hookup = { source = \"single coil\", volume = \"500k audio\", load = \"line input\", "
      "second_channel = 3, second = { source = \"humbucker\" } }";
  const std::string text = replaced(kJob, "hookup_file = \"loud.hookup.toml\"", both);
  CHECK(folder.read(text).candidates[0].hookup.second_channel == 3);
  const Job job = folder.read(replaced(text, "loop = [2.0, 14.0]", "second_channel = 2"));
  CHECK(job.take.second_channel == 2);
  CHECK(job.candidates[0].hookup.second_channel == 2);
  CHECK_FALSE(job.candidates[1].hookup.second_channel.has_value());
  for (const std::string channel : {"0", "9", "1.5", "\"left\""}) {
    CHECK_THAT(folder.refusal(replaced(text, "loop = [2.0, 14.0]", "second_channel = " + channel)),
               ContainsSubstring("x.job.toml:9") && ContainsSubstring("take.second_channel"));
  }
}

TEST_CASE("A job file with bytes changed at random reads or is refused") {
  const Folder folder;
  std::mt19937 random(7);
  int refused = 0;
  for (int i = 0; i < 2000; ++i) {
    std::string text = kJob;
    for (unsigned n = 1 + random() % 4; n > 0; --n) {
      const std::size_t at = random() % text.size();
      if (random() % 2 == 0) {
        text[at] = static_cast<char>(random() % 256);
      } else {
        text.erase(at, 1 + random() % 8);
      }
    }
    if (folder.refusal(text) != "accepted") ++refused;
  }
  CHECK(refused > 500);
  CHECK(refused < 2000);
}

TEST_CASE("Settings of the call are laid over every candidate and leave the written job as it is") {
  const Folder folder;
  const Job job = folder.read(kJob, {"", {"load=microphone input"}});
  for (const JobCandidate& candidate : job.candidates) {
    CHECK_THAT(candidate.hookup.load.resistance_ohm, WithinRel(1500, 1e-12));
  }
  CHECK_THAT(job_text(job), !ContainsSubstring("microphone"));
}
