// Whether a file named inside another file stays in that file's folder.
#pragma once

#include <filesystem>

namespace unsoldered {

/// True for an absolute path, one with ".." that climbs out of `folder`, and one that gets out by a link.
/// `folder` empty: the current one. The file need not exist.
bool leads_out_of(const std::filesystem::path& folder, const std::filesystem::path& file);

}  // namespace unsoldered
