// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <memory>

#include "jobs/make_maps.h"
#include "model/patch_maker.h"

namespace foreglow {

/// Returns how many pixels a patch gets on each side besides its own, so that nothing from beyond its edge
/// comes into a channel's beam: five sigma of the widest.
[[nodiscard]] int patch_margin(const Plan& plan, const PatchSpec& patch);

/// Makes and writes the close-ups of a study, one realization after the other.
class PatchWriter {
  public:
    PatchWriter(const Plan& plan, const DetailedSky& sky, Progress& progress);
    ~PatchWriter();
    PatchWriter(const PatchWriter&) = delete;
    PatchWriter& operator=(const PatchWriter&) = delete;

    /// @param whole  the realization's full sky
    void write(int realization, const SkyModel& whole, OutputFolder& folder, MakeResult& result) const;

  private:
    const Plan& plan_;
    std::vector<std::unique_ptr<PatchMaker>> makers_;  // [patches]
};

/// Adds the files of patches to a plan, and their memory.
void list_patches(Plan& plan);

}  // namespace foreglow
