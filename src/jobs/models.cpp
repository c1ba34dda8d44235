// SPDX-License-Identifier: GPL-2.0-or-later
#include "jobs/models.h"

#include <algorithm>

#include "base/error.h"
#include "base/text.h"
#include "model/bundled_models.h"
#include "model/galaxy_cache.h"
#include "model/model_file.h"

namespace foreglow {
namespace {

std::filesystem::path cache_folder() {
    const auto folder = default_cache_folder();
    if (!folder)
        throw InputError(
            "no cache folder is known, since neither XDG_CACHE_HOME nor HOME is set: set one, or "
            "name a folder with `foreglow make --cache DIR`");
    return *folder;
}

std::string size_of(const CacheSize& size) {
    return std::to_string(size.entries) + (size.entries == 1 ? " entry, " : " entries, ") +
           format_bytes(size.bytes);
}

}  // namespace

std::string list_models() {
    std::size_t width = 0;
    for (const BundledModel& model : list_bundled_models())
        width = std::max(width, model.name.size());
    std::string lines;
    for (const BundledModel& model : list_bundled_models()) {
        const std::string name(model.name);
        lines += name + std::string(width + 2 - name.size(), ' ') + read_bundled_model(name).title + "\n";
    }
    return lines;
}

std::string describe_cache() {
    const std::filesystem::path folder = cache_folder();
    return folder.string() + ": " + size_of(measure_cache(folder)) + "\n";
}

std::string empty_cache() {
    const std::filesystem::path folder = cache_folder();
    return folder.string() + ": removed " + size_of(clear_cache(folder)) + "\n";
}

std::string print_model(const std::string& name) {
    return read_bundled_model(name).source;
}

}  // namespace foreglow
