#include "src/job_render.h"

#include "dsp/error.h"
#include "src/number_text.h"
#include "src/take.h"

namespace unsoldered {
namespace {

/// A path of the job, never to be mistaken for a word such as "nothing".
std::string path_text(const Job& job, const std::string& written) {
  const std::filesystem::path path = path_in_job(job, written);
  return path.has_parent_path() ? path.string() : "./" + path.string();
}

}  // namespace

void request_job(const Job& job, RenderRequest& request) {
  switch (job.take.kind) {
    case TakeKind::file:
      request.take = path_text(job, job.take.file);
      break;
    case TakeKind::built_in:
      request.take = kBuiltInTake;
      break;
    case TakeKind::live:
      throw InputError(job.file.string() +
                       ": the take of this job is live, and clips are made from a recording; name one: unsoldered "
                       "render TAKE --job " +
                       job.file.string());
  }
  for (std::size_t i = 0; i < job.candidates.size(); ++i) {
    const JobCandidate& candidate = job.candidates[i];
    RenderHookup hookup{candidate.hookup_file.empty() ? job.file : path_in_job(job, candidate.hookup_file),
                        candidate.hookup, candidate.inputs, candidate_stem(job, i), candidate.dial};
    hookup.hookup.volume.dial = candidate.dial;  // where it stands while another knob turns
    hookup.inputs.push_back(job.file);
    request.hookups.push_back(std::move(hookup));
  }
  request.match_loudness = request.match_loudness || job.settings.match_loudness;
}

std::string recorded_through_text(const Job& job) {
  const std::optional<JobRecordedThrough>& recorded = job.take.recorded_through;
  if (!recorded || recorded->kind == RecordedThroughKind::nothing) return "nothing";
  if (recorded->kind == RecordedThroughKind::instrument) return "instrument";
  return path_text(job, recorded->hookup_file) + "@" + format_number(recorded->dial);
}

std::string heard_through_text(const Job& job) {
  switch (job.take.heard_through.kind) {
    case HeardThroughKind::nothing:
      return "nothing";
    case HeardThroughKind::loudspeaker:
      return "guitar loudspeaker";
    case HeardThroughKind::impulse_response:
      break;
  }
  return path_text(job, job.take.heard_through.impulse_response);
}

}  // namespace unsoldered
