// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <chrono>
#include <cstdint>
#include <string>
#include <vector>

namespace foreglow {

/// Tells a person on standard error how the work goes: one live line on a terminal, plain lines in a log,
/// nothing when quiet.
class Progress {
  public:
    enum class Style { Quiet, Log, Terminal };

    explicit Progress(Style style = Style::Quiet) : style_(style) {}
    /// Takes the live line away, so that a message printed after an error begins on an empty one.
    ~Progress();
    Progress(const Progress&) = delete;
    Progress& operator=(const Progress&) = delete;
    /// Returns the style that fits standard error: a live line on a terminal, plain lines elsewhere.
    [[nodiscard]] static Style style_of_stderr();

    /// Begins a phase of `total` steps (0: unknown) named in a few words.
    void begin(const std::string& phase, std::int64_t total = 0);
    /// Says that `done` steps of the phase are finished.
    void step(std::int64_t done);
    /// Ends the phase; a log gets one line with the seconds it took.
    void end();
    /// Prints one line of notice, also kept for the manifest; quiet keeps it without printing.
    void notice(const std::string& text);
    /// Prints one line that begins with "warning:", kept as well.
    void warn(const std::string& text);

    struct Phase {
        std::string name;
        double seconds = 0;
    };
    [[nodiscard]] const std::vector<Phase>& phases() const { return phases_; }
    [[nodiscard]] const std::vector<std::string>& warnings() const { return warnings_; }
    [[nodiscard]] const std::vector<std::string>& notices() const { return notices_; }

  private:
    void print_line(const std::string& line);
    void draw_live(std::int64_t done);
    void clear_live();

    using Clock = std::chrono::steady_clock;
    Style style_;
    std::string phase_;
    std::int64_t total_ = 0;
    bool live_ = false;
    Clock::time_point phase_start_;
    Clock::time_point last_draw_;
    std::vector<Phase> phases_;
    std::vector<std::string> warnings_;
    std::vector<std::string> notices_;
};

}  // namespace foreglow
