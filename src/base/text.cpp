// SPDX-License-Identifier: GPL-2.0-or-later
#include "base/text.h"

#include <algorithm>
#include <array>
#include <charconv>
#include <cmath>
#include <cstdio>
#include <numeric>

#include "base/error.h"
#include "base/quantity.h"

namespace foreglow {
namespace {

std::size_t edit_distance(std::string_view a, std::string_view b) {
    std::vector<std::size_t> row(b.size() + 1);
    std::iota(row.begin(), row.end(), std::size_t{0});
    for (std::size_t i = 1; i <= a.size(); ++i) {
        std::size_t diagonal = row[0];
        row[0] = i;
        for (std::size_t j = 1; j <= b.size(); ++j) {
            const std::size_t substituted = diagonal + (a[i - 1] == b[j - 1] ? 0U : 1U);
            diagonal = row[j];
            row[j] = std::min({row[j] + 1, row[j - 1] + 1, substituted});
        }
    }
    return row[b.size()];
}

}  // namespace

std::string_view trim(std::string_view text) {
    constexpr std::string_view blanks = " \t\r\n";
    const auto first = text.find_first_not_of(blanks);
    if (first == std::string_view::npos) return {};
    return text.substr(first, text.find_last_not_of(blanks) - first + 1);
}

std::string to_lower(std::string_view text) {
    std::string lower(text);
    for (char& c : lower)
        if (c >= 'A' && c <= 'Z') c = static_cast<char>(c - 'A' + 'a');
    return lower;
}

std::vector<std::string> split(std::string_view text, char separator) {
    std::vector<std::string> pieces;
    std::size_t begin = 0;
    while (true) {
        const auto end = text.find(separator, begin);
        pieces.emplace_back(text.substr(begin, end == std::string_view::npos ? end : end - begin));
        if (end == std::string_view::npos) return pieces;
        begin = end + 1;
    }
}

std::string nearest_word(std::string_view word, std::span<const std::string> candidates) {
    const std::string lower = to_lower(word);
    std::string best;
    std::size_t best_distance = std::max<std::size_t>(2, word.size() / 2) + 1;
    for (const std::string& candidate : candidates) {
        const std::size_t distance = edit_distance(lower, to_lower(candidate));
        if (distance < best_distance) {
            best_distance = distance;
            best = candidate;
        }
    }
    return best;
}

std::string format_number(double value, int digits) {
    std::array<char, 64> buffer{};
    std::snprintf(buffer.data(), buffer.size(), "%.*g", digits, value);
    return buffer.data();
}

std::string format_exact(double value) {
    std::array<char, 64> buffer{};
    const auto result = std::to_chars(buffer.data(), buffer.data() + buffer.size(), value);
    return {buffer.data(), result.ptr};
}

std::string format_bytes(std::uint64_t bytes) {
    constexpr std::array<const char*, 6> names{"B", "KiB", "MiB", "GiB", "TiB", "PiB"};
    double value = static_cast<double>(bytes);
    std::size_t step = 0;
    while (value >= (step == 0 ? 1024 : 1023.95) &&
           step + 1 < names.size()) {  // 1023.95 would be written as 1024.0
        value /= 1024;
        ++step;
    }
    std::array<char, 64> buffer{};
    std::snprintf(buffer.data(), buffer.size(), step == 0 ? "%.0f %s" : "%.1f %s", value, names.at(step));
    return buffer.data();
}

std::uint64_t parse_bytes(std::string_view text) {
    struct Scale {
        std::string_view name;
        double bytes;
    };
    constexpr std::array<Scale, 9> scales{{{"B", 1.0},
                                           {"kB", 1e3},
                                           {"MB", 1e6},
                                           {"GB", 1e9},
                                           {"TB", 1e12},
                                           {"KiB", 1024.0},
                                           {"MiB", 1048576.0},
                                           {"GiB", 1073741824.0},
                                           {"TiB", 1099511627776.0}}};
    const NumberWithUnit quantity = parse_number_with_unit(text);
    for (const Scale& scale : scales) {
        if (scale.name != quantity.unit) continue;
        const double bytes = quantity.value * scale.bytes;
        if (!(bytes >= 1 && bytes < 1e18))
            throw InputError("must be a size above zero, but is '" + std::string(text) + "'");
        return static_cast<std::uint64_t>(bytes);
    }
    throw InputError("needs a unit of memory such as \"8 GiB\" or \"500 MB\", but is '" + std::string(text) +
                     "'");
}

}  // namespace foreglow
