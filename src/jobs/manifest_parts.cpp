// SPDX-License-Identifier: GPL-2.0-or-later
#include "jobs/manifest_parts.h"

#include <regex>

#include "base/parallel.h"
#include "io/hash.h"

namespace foreglow {
namespace fs = std::filesystem;

JsonValue describe_input_files(const std::vector<fs::path>& inputs) {
    std::vector<std::string> sums(inputs.size());
    parallel_for_blocks(static_cast<std::int64_t>(inputs.size()), 1, [&](std::int64_t i, std::int64_t) {
        const auto n = static_cast<std::size_t>(i);
        sums[n] = sha256_of_file(inputs[n]);
    });
    JsonValue::Array array;
    for (std::size_t i = 0; i < inputs.size(); ++i)
        array.push_back(JsonValue::Object{{"name", inputs[i].filename().string()},
                                          {"bytes", static_cast<std::int64_t>(fs::file_size(inputs[i]))},
                                          {"sha256", sums[i]}});
    return array;
}

JsonValue describe_output_files(const fs::path& folder, const std::vector<std::string>& names,
                                bool with_sha256) {
    struct Sums {
        std::string xxh3, sha256;
    };
    std::vector<Sums> sums(names.size());
    parallel_for_blocks(static_cast<std::int64_t>(sums.size()), 1, [&](std::int64_t i, std::int64_t) {
        const auto n = static_cast<std::size_t>(i);
        const fs::path path = folder / names[n];
        sums[n].xxh3 = xxh3_128_of_file(path);
        if (with_sha256) sums[n].sha256 = sha256_of_file(path);
    });
    JsonValue::Array array;
    for (std::size_t i = 0; i < sums.size(); ++i) {
        JsonValue::Object file{{"name", names[i]},
                               {"bytes", static_cast<std::int64_t>(fs::file_size(folder / names[i]))},
                               {"xxh3_128", sums[i].xxh3}};
        if (with_sha256) file.emplace_back("sha256", sums[i].sha256);
        array.push_back(std::move(file));
    }
    return array;
}

JsonValue describe_timings(const Progress& progress) {
    JsonValue::Array phases;
    for (const Progress::Phase& phase : progress.phases())
        phases.push_back(JsonValue::Object{{"phase", phase.name}, {"seconds", phase.seconds}});
    return phases;
}

JsonValue describe_texts(const std::vector<std::string>& texts) {
    JsonValue::Array array;
    for (const std::string& one : texts)
        array.emplace_back(one);
    return array;
}

JsonValue describe_texts_without_folders(const std::vector<std::string>& texts,
                                         const std::vector<fs::path>& inputs) {
    JsonValue::Array array;
    for (std::string one : texts) {
        for (const fs::path& input : inputs) {
            const std::string path = input.string();
            const std::string name = input.filename().string();
            for (std::size_t at = one.find(path); at != std::string::npos && path != name;
                 at = one.find(path, at + name.size()))
                one.replace(at, path.size(), name);
        }
        array.emplace_back(std::move(one));
    }
    return array;
}

std::string without_absolute_paths(const std::string& text) {
    static const std::regex absolute(R"((["'=])\s*/(?:[^"'\n/]*/)*)");
    return std::regex_replace(text, absolute, "$1");
}

}  // namespace foreglow
