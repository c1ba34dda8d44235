// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <string>
#include <vector>

#include "io/json_value.h"
#include "jobs/row_format.h"

namespace foreglow {

/// Rows of one kind under column names, which are also the JSON keys.
class ResultRows {
  public:
    explicit ResultRows(std::vector<std::string> columns) : columns_(std::move(columns)) {}

    /// @param cells  [columns]; null where there is no value
    void add(std::vector<JsonValue> cells);
    [[nodiscard]] std::size_t size() const { return rows_.size(); }

    /// Returns the rows: aligned columns with 7 digits and "-" for no value; or CSV with a header, empty
    /// cells for no value; or one array of objects. The latter two have the shortest digits that read back to
    /// the same double; not-a-number counts as no value.
    [[nodiscard]] std::string text(RowFormat format) const;

  private:
    std::vector<std::string> columns_;
    std::vector<std::vector<JsonValue>> rows_;
};

}  // namespace foreglow
