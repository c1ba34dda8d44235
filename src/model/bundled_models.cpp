// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/bundled_models.h"

namespace foreglow {

const BundledModel* find_bundled_model(std::string_view name) {
    for (const BundledModel& model : list_bundled_models())
        if (model.name == name) return &model;
    return nullptr;
}

std::vector<std::string> list_bundled_names() {
    std::vector<std::string> names;
    for (const BundledModel& model : list_bundled_models())
        names.emplace_back(model.name);
    return names;
}

}  // namespace foreglow
