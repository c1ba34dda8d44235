// SPDX-License-Identifier: GPL-2.0-or-later
#include "base/progress.h"

#include <unistd.h>

#include <cstdio>

#include "base/text.h"

namespace foreglow {

Progress::Style Progress::style_of_stderr() {
    return isatty(STDERR_FILENO) != 0 ? Style::Terminal : Style::Log;
}

Progress::~Progress() {
    clear_live();
    std::fflush(stderr);
}

void Progress::print_line(const std::string& line) {
    if (style_ == Style::Quiet) return;
    clear_live();
    std::fprintf(stderr, "%s\n", line.c_str());
    std::fflush(stderr);
}

void Progress::clear_live() {
    if (!live_) return;
    std::fputs("\r\033[K", stderr);
    live_ = false;
}

void Progress::draw_live(std::int64_t done) {
    if (style_ != Style::Terminal) return;
    std::string line = phase_;
    if (total_ > 0) line.append(" ").append(std::to_string(done)).append("/").append(std::to_string(total_));
    std::fprintf(stderr, "\r\033[K%s", line.c_str());
    std::fflush(stderr);
    live_ = true;
    last_draw_ = Clock::now();
}

void Progress::begin(const std::string& phase, std::int64_t total) {
    phase_ = phase;
    total_ = total;
    phase_start_ = Clock::now();
    draw_live(0);
}

void Progress::step(std::int64_t done) {
    constexpr auto interval = std::chrono::milliseconds(100);
    if (style_ == Style::Terminal && (Clock::now() - last_draw_ >= interval || done == total_))
        draw_live(done);
}

void Progress::end() {
    const double seconds = std::chrono::duration<double>(Clock::now() - phase_start_).count();
    phases_.push_back({phase_, seconds});
    clear_live();
    if (style_ == Style::Log) print_line(phase_ + ": " + format_number(seconds, 3) + " s");
}

void Progress::notice(const std::string& text) {
    notices_.push_back(text);
    print_line("note: " + text);
}

void Progress::warn(const std::string& text) {
    warnings_.push_back(text);
    print_line("warning: " + text);
}

}  // namespace foreglow
