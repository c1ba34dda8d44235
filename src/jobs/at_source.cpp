// SPDX-License-Identifier: GPL-2.0-or-later
#include "jobs/at_source.h"

#include <algorithm>
#include <charconv>
#include <cmath>
#include <fstream>

#include "base/error.h"
#include "base/text.h"
#include "io/text_file.h"
#include "io/toml_document.h"
#include "model/bundled_models.h"

namespace foreglow {
namespace {

constexpr double lowest_hz = 1.0, highest_hz = 1e13;
constexpr int most_frequencies = 100000;

// FITS begins with SIMPLE, gzip with 1f 8b.
bool is_map_file(const std::filesystem::path& path) {
    std::ifstream file(path, std::ios::binary);
    std::array<char, 8> start{};
    file.read(start.data(), start.size());
    const std::string_view text(start.data(), static_cast<std::size_t>(file.gcount()));
    return text.starts_with("SIMPLE") || text.starts_with("\x1f\x8b");
}

// A study names a model and has channels; a model has sections of its own.
bool is_study_file(const std::filesystem::path& path) {
    const TomlValue document = parse_toml(read_text_file(path, "study or model file"), path.string());
    const auto has = [&](const char* key) { return find_value(document, key) != nullptr; };
    return has("model") || has("nside") || has("channel") || has("channel_grid");
}

[[noreturn]] void fail_unknown_source(const std::string& source) {
    const std::vector<std::string> names = list_bundled_names();
    const std::string nearest = nearest_word(source, names);
    std::string list;
    for (const std::string& name : names)
        list += (list.empty() ? "" : ", ") + name;
    throw InputError(to_one_line("'" + source + "' is neither a bundled model (" + list +
                                 ") nor a file or folder: " +
                                 (nearest.empty() ? "name a model file, a study, a run's folder "
                                                    "or an index map"
                                                  : "did you mean '" + nearest + "'?")));
}

Frequency checked(Frequency frequency, const std::string& text) {
    if (!(frequency.hz() >= lowest_hz && frequency.hz() <= highest_hz))
        throw InputError("--frequency " + text + " is outside 1 Hz to 10 THz");
    return frequency;
}

Frequency read_one(const std::string& text) {
    try {
        return checked(parse_frequency(text), text);
    } catch (const InputError& error) {
        throw InputError(std::string("--frequency ") + error.what());
    }
}

void add_grid(const std::string& text, const std::vector<std::string>& parts, std::vector<Frequency>& out) {
    const std::string_view digits = trim(parts[2]);
    int count = 0;
    const auto [end, code] = std::from_chars(digits.data(), digits.data() + digits.size(), count);
    if (code != std::errc() || end != digits.data() + digits.size() || count < 1 || count > most_frequencies)
        throw InputError("--frequency " + text + ": the count must be a whole number from 1 to " +
                         std::to_string(most_frequencies));
    const double first = read_one(parts[0]).hz();
    const double last = read_one(parts[1]).hz();
    if (count == 1 && first != last)
        throw InputError("--frequency " + text + ": one frequency cannot be both ends: ask for 2 or more");
    for (int i = 0; i < count; ++i) {
        const double share = count > 1 ? static_cast<double>(i) / (count - 1) : 0.0;
        const bool is_end = i == count - 1;  // exact, whatever the rounding of the power
        out.push_back(Frequency::from_hz(is_end ? last : first * std::pow(last / first, share)));
    }
}

}  // namespace

std::vector<Frequency> read_at_frequencies(const std::vector<std::string>& texts) {
    std::vector<Frequency> out;
    for (const std::string& text : texts) {
        const std::vector<std::string> parts = split(text, ':');
        if (parts.size() == 3)
            add_grid(text, parts, out);
        else if (parts.size() == 1)
            out.push_back(read_one(text));
        else
            throw InputError("--frequency " + text +
                             ": write one frequency, \"70 MHz\", or a log grid, \"50 MHz:200 MHz:7\"");
    }
    return out;
}

AtSource open_at_source(const AtOptions& options) {
    const std::filesystem::path path = options.source;
    std::error_code code;
    const bool exists = options.source.find('\0') == std::string::npos && !options.source.empty() &&
                        std::filesystem::exists(path, code);
    if (find_bundled_model(options.source) != nullptr) return open_model_at(options);
    if (!exists) fail_unknown_source(options.source);
    if (std::filesystem::is_directory(path, code)) return open_run_at(options);
    if (is_map_file(path)) return open_index_map_at(options);
    return is_study_file(path) ? open_study_at(options) : open_model_at(options);
}

}  // namespace foreglow
