// SPDX-License-Identifier: GPL-2.0-or-later
#include "base/error.h"

#include <string_view>

namespace foreglow {

void fail_contract(const char* condition, const char* file, int line) {
    std::string_view name = file;
    if (const auto slash = name.rfind('/'); slash != std::string_view::npos) name.remove_prefix(slash + 1);
    std::string message = "contract broken: ";
    message.append(condition).append(" at ").append(name).append(":").append(std::to_string(line));
    throw ContractError(message);
}

}  // namespace foreglow
