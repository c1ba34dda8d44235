// SPDX-License-Identifier: GPL-2.0-or-later
#include "base/build_info.h"

#include "foreglow_version.h"

namespace foreglow {

std::string version() {
    return FOREGLOW_VERSION;
}

std::string build_description() {
    return FOREGLOW_COMPILER ", " FOREGLOW_BUILD_TYPE;
}

}  // namespace foreglow
