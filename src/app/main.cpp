// SPDX-License-Identifier: GPL-2.0-or-later
#include "app/command_line.h"

int main(int argc, char** argv) {
    return foreglow::run_command_line(argc, argv);
}
