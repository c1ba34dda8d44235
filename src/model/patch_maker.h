// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <memory>
#include <optional>
#include <vector>

#include "model/detailed_sky.h"
#include "model/plane_draw.h"
#include "model/study_spec.h"
#include "sphere/patch_frame.h"

namespace foreglow {

/// The a_lm of a template, from which its values at any direction come; shared by all patches.
struct TemplateAlms {
    Alm intensity;
    AlmEB polarization;
    std::vector<double> filled;  ///< [npix], 1 where the template was undefined; empty where nowhere
    int lmax = 0;
};

/// Analyses the template up to 2.5 nside.
[[nodiscard]] TemplateAlms analyse_template(const DetailedSky& sky, bool polarized);

/// What the law of a patch's pixels is made of; [n][n], margin included.
struct PatchSky {
    SkyStrip values;              ///< Q and U against the plane's axes; everywhere defined
    std::vector<bool> undefined;  ///< where the template has no value; empty where nowhere
};

/// Makes the skies of one patch: the large scales from the sphere, at the pixels' own directions, the small
/// ones from the plane.
///
/// The sphere's draw ends at the detail's lmax L; the plane begins at the wave number L + 1/2 with the sky's
/// C_l less what the template still holds there. Amplitudes, the form and the modulation are those of the
/// full sky; indices and modulation are interpolated between the full sky's pixels.
class PatchMaker {
  public:
    /// @param frame   of the study
    /// @param margin  pixels added on each side
    PatchMaker(const DetailedSky& sky, std::shared_ptr<const TemplateAlms> alms, const PatchSpec& patch,
               Frame frame, int margin, bool polarized);

    /// @param whole  the same realization's full sky (DetailedSky::realize), for its indices
    [[nodiscard]] PatchSky make(int realization, const SkyModel& whole) const;
    /// Returns psi of PatchFrame::turns for the study's frame: (Q + iU) of the pixels' own meridians = (Q +
    /// iU) e^{2 i psi}.
    [[nodiscard]] const std::vector<double>& turns() const { return turns_; }
    [[nodiscard]] const PatchFrame& frame() const { return frame_; }
    /// Returns the last l that comes from the sphere's draw; 0 without [detail].
    [[nodiscard]] int seam() const { return seam_; }

  private:
    void prepare_detail();
    void add_intensity(int realization, std::vector<double>& intensity) const;
    void add_polarization(int realization, StokesValues& stokes) const;
    [[nodiscard]] std::vector<double> interpolate_float(std::span<const float> map) const;
    [[nodiscard]] std::vector<double> interpolate_double(std::span<const double> map) const;
    void turn(StokesValues& stokes, std::span<const double> angles, double sign) const;

    const DetailedSky& sky_;
    std::shared_ptr<const TemplateAlms> alms_;
    PatchFrame frame_;
    std::string name_;
    bool polarized_;
    std::vector<Vector3> directions_;  // in the sky's frame
    std::vector<double> turns_, sky_turns_;
    std::vector<double> template_;  // intensity
    StokesValues template_stokes_;  // against the plane's axes
    int seam_ = 0;
    PlaneDraw plane_;
    DetailSpectra plane_spectra_;  // tt in the units of the Gaussian that is drawn
    double plane_half_variance_ = 0;
    std::vector<double> weights_, steepness_, polarized_weights_;
};

}  // namespace foreglow
