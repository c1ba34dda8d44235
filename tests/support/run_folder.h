// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <filesystem>
#include <set>
#include <string>
#include <vector>

#include "jobs/make.h"
#include "model/study_file.h"
#include "support/sky_builder.h"

namespace foreglow::testing {

/// A folder with a small model of its own maps (nside 8) and studies of it, and runs beside them.
class RunFolder {
  public:
    RunFolder() {
        const HealpixGrid grid(8);
        fits_map(8, {sample(grid, test_brightness), sample(grid, test_q), sample(grid, test_u)}, "K_RJ")
            .card("POLCCONV", "'COSMO   '")
            .write(folder_ / "survey.fits");
        fits_map(8, {sample(grid, test_index)}).write(folder_ / "index.fits");
        write("model.toml",
              "title = \"Invented test sky\"\nreference_frequency = \"408 MHz\"\n"
              "[intensity]\nmap = \"survey.fits\"\n"
              "[polarization]\nmap = \"survey.fits\"\ncolumns = [2, 3]\n"
              "[index]\nmap = \"index.fits\"\n[curvature]\nvalue = -0.03\n");
    }
    void write(const std::string& name, const std::string& text) const {
        write_whole_file(folder_ / name, text);
    }
    /// Writes study.toml with these lines at its top and two channels, one with a beam.
    void write_study(const std::string& lines = "") const {
        write("study.toml",
              "title = \"Test\"\nmodel = \"model.toml\"\nnside = 8\nlmax = 16\naccuracy = 1e-4\n" + lines +
                  "\n[[channel]]\nname = \"low\"\nfrequency = \"1 GHz\"\n"
                  "[[channel]]\nname = \"high\"\nfrequency = \"30 GHz\"\nbandwidth = \"6 GHz\"\nbeam_fwhm = "
                  "\"15 deg\"\n");
    }
    [[nodiscard]] PlanRequest request(const std::string& out = "out", bool replace = false,
                                      const std::vector<std::string>& overrides = {}) const {
        PlanRequest plan;
        plan.study = read_study(folder_ / "study.toml", overrides);
        plan.out = folder_ / out;
        plan.replace = replace;
        return plan;
    }
    MakeSummary make(const std::string& out = "out", bool replace = false,
                     const std::vector<std::string>& overrides = {}) const {
        Progress progress;
        return run_make({request(out, replace, overrides), false}, progress);
    }
    /// Returns all files below a folder, as "maps/low.fits".
    [[nodiscard]] std::set<std::string> files(const std::string& below = "out") const {
        std::set<std::string> names;
        if (std::filesystem::exists(folder_ / below))
            for (const auto& entry : std::filesystem::recursive_directory_iterator(folder_ / below))
                if (!entry.is_directory())
                    names.insert(entry.path().lexically_relative(folder_ / below).string());
        return names;
    }
    [[nodiscard]] std::filesystem::path operator/(const std::string& name) const { return folder_ / name; }

  private:
    TemporaryFolder folder_;
};

}  // namespace foreglow::testing
