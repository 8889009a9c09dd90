// What a take already passed when it was recorded, taken out before it is played (dsp/undo_filter.h).
#pragma once

#include <filesystem>
#include <memory>
#include <optional>
#include <string>
#include <vector>

#include "dsp/hookup.h"
#include "src/convolved_stream.h"
#include "src/take.h"

namespace unsoldered {

inline constexpr double kUsualBoostLimitDb = 24;
inline constexpr double kMostBoostLimitDb = 60;

/// 0 to 60 dB; `where` opens the message ("--boost-limit"). Throws InputError.
double parse_boost_limit(const std::string& text, const std::string& where);

struct RecordedThrough {
  std::string name;              // for messages: "guitar.hookup.toml at dial 7"
  Hookup hookup;                 // every knob where it was
  std::optional<Hookup> second;  // what the second source's own channel passed, where that is a hookup of its own
  std::vector<std::filesystem::path> inputs = {};  // what was read for it
};

/// "nothing": empty. "instrument": the source of `first` (candidate A) with the knob at 10, its volume pot as a resistor, 3 m
/// of cable of 100 pF/m and 1 megohm, nothing else. Else a hookup file, "@DIAL" behind it (10 when not given; a file whose
/// own name ends like that is meant when there is one). Throws InputError, its message opened by `where`.
std::optional<RecordedThrough> parse_recorded_through(const std::string& text, const Hookup& first,
                                                      const std::string& where);

/// The hookup with its knobs at every position in use, those of a turn finely sampled.
std::vector<Hookup> knob_positions(const Hookup& hookup, const std::vector<KnobMotion>& motions);

/// The filters that take it out, for a hookup that is played at these knob positions (`positions`: the hookup with its
/// knobs at each). `messages` gains what the user should know, opened by `played_name`.
/// Throws InputError where nothing comes through what it was recorded through.
ChannelPlans plan_undoing(const RecordedThrough& recorded, double boost_limit_db, const std::string& played_name,
                          const std::vector<Hookup>& positions, const TakeFormat& format,
                          std::vector<std::string>& messages);

/// A take with that taken out: as long as it was and lined up with it, behind what the filter answers early.
class UndoneTake : public Take {
 public:
  UndoneTake(std::unique_ptr<Take> take, const ChannelPlans& plans);
  TakeFormat format() const noexcept override { return take_->format(); }
  int read(double* interleaved, int frames) override;
  int lead_frames() const noexcept override { return lead_; }
  std::string warning() const override { return take_->warning(); }

 private:
  void refill();

  std::unique_ptr<Take> take_;
  int lead_;
  ConvolvedStream stream_;
  std::vector<double> raw_;
  std::vector<std::vector<double>> in_;
  std::vector<double> ready_;  // interleaved
  std::size_t given_ = 0;
  bool ended_ = false;
};

}  // namespace unsoldered
