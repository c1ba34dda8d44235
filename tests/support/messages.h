// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <gtest/gtest.h>

#include <string>

namespace foreglow::testing {

/// Returns the message of the exception of that kind which the work throws; a failed test and "" where it
/// throws none.
template <class Kind, class Work>
[[nodiscard]] std::string message_of(const Work& work) {
    try {
        static_cast<void>(work());
    } catch (const Kind& error) {
        return error.what();
    }
    ADD_FAILURE() << "nothing was thrown";
    return "";
}

/// Tells whether a text contains a part.
[[nodiscard]] inline bool has(const std::string& text, const std::string& part) {
    return text.find(part) != std::string::npos;
}

/// Tells how often a text contains a part.
[[nodiscard]] inline int count_of(const std::string& text, const std::string& part) {
    int count = 0;
    for (auto at = text.find(part); at != std::string::npos; at = text.find(part, at + part.size()))
        ++count;
    return count;
}

}  // namespace foreglow::testing
