#include "src/loudness_match.h"

#include <algorithm>
#include <cmath>
#include <limits>

namespace unsoldered {
namespace {

constexpr double kLowest = -std::numeric_limits<double>::infinity();

/// The gain, at most `most`, at which the clip measures `target`. One step is exact while the same blocks stay above
/// the gates; the absolute gate lets other blocks in when a quiet clip is raised, hence several.
double gain_for(const Loudness& clip, double target, double most) {
  double gain = most;
  double best = gain;
  double best_miss = std::numeric_limits<double>::infinity();
  for (int step = 0; step < 50; ++step) {
    const double miss = target - clip.integrated_lufs(gain);
    if (std::abs(miss) < best_miss) {
      best_miss = std::abs(miss);
      best = gain;
    }
    if (best_miss < 1e-9 || !std::isfinite(miss)) break;
    gain = std::min(most, gain * std::pow(10, miss / 20));
  }
  return best;
}

}  // namespace

std::vector<MatchedGain> match_loudness(const std::vector<const Loudness*>& clips, double ceiling) {
  std::vector<MatchedGain> gains(clips.size());
  std::vector<double> most(clips.size());  // the gain that puts the peak at the ceiling
  double target = std::numeric_limits<double>::infinity();
  for (std::size_t i = 0; i < clips.size(); ++i) {
    const double peak = clips[i]->true_peak();
    most[i] = peak > 0 ? ceiling / peak : 1;
    const double highest = clips[i]->integrated_lufs(most[i]);
    gains[i].left_out = clips[i]->integrated_lufs() == kLowest || highest == kLowest;
    if (!gains[i].left_out) target = std::min(target, highest);
  }
  for (std::size_t i = 0; i < clips.size(); ++i) {
    gains[i].gain = gains[i].left_out ? std::min(1.0, most[i]) : gain_for(*clips[i], target, most[i]);
  }
  return gains;
}

}  // namespace unsoldered
