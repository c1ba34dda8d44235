// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cstdio>
#include <string>

namespace foreglow::testing {

/// Tells whether Python's XML parser (expat) takes a document.
inline bool is_well_formed(const std::string& document) {
    std::FILE* const parser = popen(
        "/usr/bin/python3 -c 'import sys, xml.dom.minidom as x; x.parseString(sys.stdin.buffer.read())'",
        "w");
    if (parser == nullptr) return false;
    const bool sent = std::fwrite(document.data(), 1, document.size(), parser) == document.size();
    return pclose(parser) == 0 && sent;
}

}  // namespace foreglow::testing
