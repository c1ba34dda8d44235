// SPDX-License-Identifier: GPL-2.0-or-later
#include "jobs/output_folder.h"

#include <algorithm>

#include "base/error.h"
#include "jobs/manifest.h"

namespace foreglow {
namespace fs = std::filesystem;

void check_output_folder(const fs::path& folder, bool replace) {
    std::error_code code;
    if (!fs::exists(folder, code)) return;
    if (!fs::is_directory(folder, code))
        throw InputError("the output " + folder.string() +
                         " exists and is no folder: give another with --out");
    if (!replace && !fs::is_empty(folder, code))
        throw InputError("the output folder " + folder.string() +
                         " exists and is not empty: add --replace, or give another with --out");
}

OutputFolder::OutputFolder(fs::path folder, bool replace) : folder_(std::move(folder)) {
    check_output_folder(folder_, replace);
    std::error_code code;
    if (replace && fs::exists(folder_, code)) remove_earlier_run();
}

OutputFolder::~OutputFolder() {
    if (kept_) return;
    std::error_code code;
    for (const fs::path& file : written_)
        fs::remove(file, code);
    for (auto made = made_folders_.rbegin(); made != made_folders_.rend(); ++made)
        if (fs::is_empty(*made, code)) fs::remove(*made, code);
}

fs::path OutputFolder::prepare(const std::string& name) {
    const fs::path file = folder_ / name;
    std::vector<fs::path> missing;
    std::error_code code;
    for (fs::path parent = file.parent_path(); !parent.empty() && !fs::exists(parent, code);
         parent = parent.parent_path())
        missing.push_back(parent);
    for (auto folder = missing.rbegin(); folder != missing.rend(); ++folder) {
        if (!fs::create_directory(*folder, code) && code)
            throw FileError("cannot make the folder " + folder->string() + ": " + code.message());
        made_folders_.push_back(*folder);
    }
    written_.push_back(file);
    return file;
}

void OutputFolder::remove_earlier_run() {
    const fs::path manifest = folder_ / "run.json";
    const std::vector<std::string> names = list_manifest_outputs(manifest);
    std::error_code code;
    fs::remove(manifest, code);
    for (const std::string& name : names) {
        const fs::path relative = fs::path(name).lexically_normal();
        if (relative.is_absolute() || relative.empty() || *relative.begin() == "..") continue;
        fs::remove(folder_ / relative, code);
    }
    for (const char* sub : {"truth/channels", "truth", "maps", "patches"})
        if (fs::is_directory(folder_ / sub, code) && fs::is_empty(folder_ / sub, code))
            fs::remove(folder_ / sub, code);
}

}  // namespace foreglow
