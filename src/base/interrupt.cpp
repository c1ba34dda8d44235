// SPDX-License-Identifier: GPL-2.0-or-later
#include "base/interrupt.h"

#include <csignal>

#include "base/error.h"

namespace foreglow {
namespace {

// The one piece of process-wide state: a signal handler has nowhere else to write.
volatile std::sig_atomic_t arrived = 0;

void note_signal(int signal) {
    arrived = signal;
    std::signal(signal, SIG_DFL);  // a second one ends the process at once
}

}  // namespace

void catch_interrupts() {
    std::signal(SIGINT, note_signal);
    std::signal(SIGTERM, note_signal);
}

void check_interrupt() {
    if (arrived != 0) throw Interrupted(arrived);
}

}  // namespace foreglow
