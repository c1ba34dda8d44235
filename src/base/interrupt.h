// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

namespace foreglow {

/// Asks the process to note SIGINT and SIGTERM instead of dying, so that half-written files can be removed
/// first.
void catch_interrupts();

/// Throws when a caught signal has arrived; long loops call it between steps.
/// @throws Interrupted with exit status 130 or 143
void check_interrupt();

}  // namespace foreglow
