// SPDX-License-Identifier: GPL-2.0-or-later
#include "jobs/temporary_run.h"

#include <cstdlib>

#include "base/error.h"

namespace foreglow {
namespace fs = std::filesystem;

TemporaryRun::TemporaryRun() {
    std::string name = (fs::temp_directory_path() / "foreglow-grade-XXXXXX").string();
    if (::mkdtemp(name.data()) == nullptr)
        throw FileError("cannot make a folder in " + fs::temp_directory_path().string() +
                        ": set TMPDIR to one that can be written to");
    path_ = name;
}

TemporaryRun::~TemporaryRun() {
    std::error_code ignored;
    fs::remove_all(path_, ignored);
}

}  // namespace foreglow
