// SPDX-License-Identifier: GPL-2.0-or-later
#include "jobs/models.h"

#include <algorithm>

#include "model/bundled_models.h"
#include "model/model_file.h"

namespace foreglow {

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

std::string print_model(const std::string& name) {
    return read_bundled_model(name).source;
}

}  // namespace foreglow
