// SPDX-License-Identifier: GPL-2.0-or-later
#include "base/error.h"

#include <sstream>
#include <string_view>

namespace foreglow {

void fail_contract(const char* condition, const char* file, int line) {
    std::string_view name = file;
    if (const auto slash = name.rfind('/'); slash != std::string_view::npos) name.remove_prefix(slash + 1);
    std::ostringstream
        message;  // a chain of + makes GCC 12 warn of an overlap that cannot be (its bug 105651)
    message << "contract broken: " << condition << " at " << name << ':' << line;
    throw ContractError(message.str());
}

}  // namespace foreglow
