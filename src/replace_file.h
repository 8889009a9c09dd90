// Replaces a small file as a whole: whoever reads it sees the old text or the new one, never a part.
#pragma once

#include <filesystem>
#include <string_view>

namespace unsoldered {

/// Makes the file when there is none. A link is followed; the permissions of a file that is replaced stay.
/// Throws CannotError, and leaves the old file as it was.
void replace_file(const std::filesystem::path& file, std::string_view text);

}  // namespace unsoldered
