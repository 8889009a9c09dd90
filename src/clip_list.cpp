#include "src/clip_list.h"

namespace unsoldered {

Table clip_table(const std::vector<ClipRow>& clips) {
  Table table{{"file", "hookup", "dial", "gain_db", "peak_dbfs", "peak_dbtp", "loudness_lufs"}, {}};
  for (const ClipRow& clip : clips) {
    const Cell dial = clip.dial ? Cell(*clip.dial) : Cell(std::string("turn"));
    const auto cell = [](const std::optional<double>& value) { return value ? Cell(*value) : Cell(); };
    table.rows.push_back(
        {clip.file, clip.hookup, dial, clip.gain_db, clip.peak_dbfs, cell(clip.peak_dbtp), cell(clip.loudness_lufs)});
  }
  return table;
}

}  // namespace unsoldered
