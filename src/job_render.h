// A job as a set of clips: every candidate at its own dial.
//
// Clips are named TAKE_A-NAME_dial-07.50.wav: the candidate's letter, then its name, the hookup file's when it has none.
#pragma once

#include <string>

#include "src/job_file.h"
#include "src/render.h"

namespace unsoldered {

/// Puts take, candidates and loudness match of the job into a request. The whole take is rendered, whatever its loop.
/// Throws InputError for a job whose take is live.
void request_job(const Job& job, RenderRequest& request);

/// What the job says its take was recorded through and is heard through, as the options of render say it.
std::string recorded_through_text(const Job& job);
std::string heard_through_text(const Job& job);

}  // namespace unsoldered
