// SPDX-License-Identifier: GPL-2.0-or-later
#include "app/command_line.h"

#ifdef __GLIBC__
#include <malloc.h>
#endif

namespace {

// Maps come and go by tens of megabytes: memory given back after each would be cleared by the system each
// time it is taken again, a tenth of a run with beams.
void keep_freed_memory() {
#ifdef __GLIBC__
    constexpr int bytes = 1 << 30;
    ::mallopt(M_MMAP_THRESHOLD, bytes);
    ::mallopt(M_TRIM_THRESHOLD, bytes);
#endif
}

}  // namespace

int main(int argc, char** argv) {
    keep_freed_memory();
    return foreglow::run_command_line(argc, argv);
}
