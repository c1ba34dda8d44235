// SPDX-License-Identifier: GPL-2.0-or-later
// What a stranger would write first: a ratio, a study of one channel, and the sentence that a wrong study
// gives.
#include <api/foreglow.h>
#include <api/foreglow_c.h>

#include <cmath>
#include <cstdio>
#include <cstring>
#include <fstream>

int main() {
    const auto nu0 = foreglow::Frequency::from_ghz(0.408);
    const double ratio = foreglow::api::brightness_ratio(foreglow::Frequency::from_ghz(0.816), nu0, -2.5);
    if (std::abs(ratio - std::pow(2.0, -2.5)) > 1e-15) return 1;
    if (foreglow_brightness_ratio(816e6, 408e6, -2.5, 0) != ratio) return 2;

    std::ofstream("study.toml")
        << "model = \"quick-sketch\"\nnside = 16\n[[channel]]\nname = \"a\"\nfrequency = \"30 GHz\"\n";
    const foreglow::api::RunResult run = foreglow::api::make_maps("study.toml");
    if (!std::filesystem::exists(run.out / "maps" / "a.fits")) return 3;

    char message[400];
    const int status = foreglow_make("no such study.toml", nullptr, 0, message, sizeof message);
    if (status != 2 || std::strstr(message, "no such study.toml") == nullptr) return 4;
    std::printf("foreglow %s: %s\n", foreglow_version(), run.out.string().c_str());
    return 0;
}
