// SPDX-License-Identifier: GPL-2.0-or-later
#include "jobs/models.h"

#include <gtest/gtest.h>

#include <algorithm>
#include <string>

#include "base/error.h"
#include "model/bundled_models.h"
#include "model/model_file.h"

namespace foreglow {
namespace {

TEST(Models, AreListedALineEach) {
    const std::string lines = list_models();
    EXPECT_EQ(static_cast<std::size_t>(std::count(lines.begin(), lines.end(), '\n')),
              list_bundled_models().size());
    EXPECT_NE(lines.find("\ndisc-and-loops     Simulated 3-D Galaxy"), std::string::npos) << lines;
}

TEST(Models, PrintAsFilesThatCanBeReadAgain) {
    for (const BundledModel& bundled : list_bundled_models()) {
        const std::string text = print_model(std::string(bundled.name));
        EXPECT_NO_THROW((void)make_model(text, "copy.toml", "copy"));
    }
    EXPECT_THROW((void)print_model("disc"), InputError);
}

}  // namespace
}  // namespace foreglow
