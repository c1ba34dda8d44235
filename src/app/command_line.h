// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

namespace foreglow {

/// Runs the command that the arguments name; results go to standard output, everything else to standard
/// error.
/// @return the exit status: 0 done, 1 the work failed, 2 the request was wrong, 130 and 143 after a signal
int run_command_line(int argc, char** argv);

}  // namespace foreglow
