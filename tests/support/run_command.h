// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cstdio>
#include <stdexcept>
#include <string>
#include <vector>

namespace foreglow::testing {

/// Puts a word in single quotes for the shell.
[[nodiscard]] inline std::string shell_word(const std::string& word) {
    std::string out = "'";
    for (const char c : word)
        out += c == '\'' ? std::string("'\\''") : std::string(1, c);
    return out + "'";
}

struct CommandResult {
    int status = -1;     ///< of the command, as pclose gives it: 0 is success
    std::string output;  ///< standard output and standard error
};

/// Runs a command of these words and waits for it.
[[nodiscard]] inline CommandResult run_command(const std::vector<std::string>& words) {
    std::string line;
    for (const auto& word : words)
        line += shell_word(word) + " ";
    std::FILE* pipe = ::popen((line + "2>&1").c_str(), "r");
    if (pipe == nullptr) throw std::runtime_error("cannot start " + line);
    CommandResult result;
    char buffer[4096];
    for (std::size_t got = 0; (got = std::fread(buffer, 1, sizeof buffer, pipe)) > 0;)
        result.output.append(buffer, got);
    result.status = ::pclose(pipe);
    return result;
}

/// Runs a script of tests/oracle with Debian's Python, which has healpy and astropy.
[[nodiscard]] inline CommandResult run_oracle(const std::string& script,
                                              const std::vector<std::string>& arguments) {
    std::vector<std::string> words = {"/usr/bin/python3",
                                      std::string(FOREGLOW_TESTS_DIR) + "/oracle/" + script};
    words.insert(words.end(), arguments.begin(), arguments.end());
    return run_command(words);
}

}  // namespace foreglow::testing
