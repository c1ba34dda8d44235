// SPDX-License-Identifier: GPL-2.0-or-later
#include "jobs/output_folder.h"

#include <algorithm>

#include "base/error.h"
#include "jobs/manifest.h"

namespace foreglow {
namespace fs = std::filesystem;
namespace {

// A run leaves files; a folder of the same name, even an empty one, is someone else's.
void remove_file(const fs::path& file) {
    std::error_code code;
    if (!fs::is_directory(fs::symlink_status(file, code))) fs::remove(file, code);
}

// Tells whether a name that a manifest lists lies within the folder, symbolic links followed.
bool lies_within(const fs::path& folder, const std::string& name) {
    const fs::path relative = fs::path(name).lexically_normal();
    if (relative.is_absolute() || relative.empty() || *relative.begin() == "..") return false;
    std::error_code code;
    const fs::path real_folder = fs::weakly_canonical(folder, code);
    const fs::path real_parent = fs::weakly_canonical((folder / relative).parent_path(), code);
    const auto [end, rest] =
        std::mismatch(real_folder.begin(), real_folder.end(), real_parent.begin(), real_parent.end());
    static_cast<void>(rest);
    return !code && end == real_folder.end();
}

}  // namespace

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
        remove_file(file);
    for (auto made = made_folders_.rbegin(); made != made_folders_.rend(); ++made)
        if (fs::is_empty(*made, code)) fs::remove(*made, code);
}

fs::path OutputFolder::prepare(const std::string& name) {
    fs::path file = folder_ / name;
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
    for (const std::string& name : names)
        if (lies_within(folder_, name)) remove_file(folder_ / name);
    for (const char* sub : {"truth/channels", "truth", "maps", "patches"})
        if (fs::is_directory(folder_ / sub, code) && fs::is_empty(folder_ / sub, code))
            fs::remove(folder_ / sub, code);
}

}  // namespace foreglow
