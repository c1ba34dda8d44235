// SPDX-License-Identifier: GPL-2.0-or-later
#include "jobs/make_patches.h"

#include <algorithm>
#include <array>
#include <cmath>

#include "base/build_info.h"
#include "base/error.h"
#include "base/interrupt.h"
#include "base/text.h"
#include "io/fits_image_write.h"
#include "model/filled_share.h"
#include "model/patch_beam.h"
#include "model/pixel_route.h"

namespace foreglow {
namespace {

constexpr double law_tolerance = 1e-7;
constexpr double margin_in_sigma = 5;

double fwhm_of(const Channel& channel, int nside) {
    if (channel.beam_fwhm) return channel.beam_fwhm->radians();
    return channel.beam ? equivalent_fwhm(*channel.beam, HealpixGrid(nside)).radians() : 0.0;
}

double sigma_of(double fwhm) {
    return fwhm / std::sqrt(8 * std::log(2.0));
}

std::string axis_name(Frame frame, bool longitude) {
    switch (frame) {
        case Frame::Galactic:
            return longitude ? "GLON-TAN" : "GLAT-TAN";
        case Frame::Icrs:
            return longitude ? "RA---TAN" : "DEC--TAN";
        case Frame::Ecliptic:
            return longitude ? "ELON-TAN" : "ELAT-TAN";
    }
    return "";
}

void add_sky_axes(const StudySpec& study, const PatchSpec& patch, std::vector<FitsCard>& cards) {
    const double middle = 0.5 * (patch.pixels + 1);
    const double longitude = std::fmod(patch.longitude.degrees() + 360, 360);
    cards.push_back({"CTYPE1", axis_name(study.frame, true), "gnomonic, longitude to the left"});
    cards.push_back({"CRPIX1", middle, ""});
    cards.push_back({"CRVAL1", longitude, "[deg]"});
    cards.push_back({"CDELT1", -patch.pixel.degrees(), "[deg] at the centre"});
    cards.push_back({"CUNIT1", "deg", ""});
    cards.push_back({"CTYPE2", axis_name(study.frame, false), "gnomonic, north up"});
    cards.push_back({"CRPIX2", middle, ""});
    cards.push_back({"CRVAL2", patch.latitude.degrees(), "[deg]"});
    cards.push_back({"CDELT2", patch.pixel.degrees(), "[deg] at the centre"});
    cards.push_back({"CUNIT2", "deg", ""});
    cards.push_back({"LONPOLE", 180.0, "[deg]"});
    if (study.frame != Frame::Galactic) cards.push_back({"RADESYS", "ICRS", ""});
}

void add_cube_axes(const StudySpec& study, std::vector<FitsCard>& cards) {
    const auto add = [&](const std::string& number, const std::string& type, const std::string& what) {
        cards.push_back({"CTYPE" + number, type, what});
        cards.push_back({"CRPIX" + number, 1.0, ""});
        cards.push_back({"CRVAL" + number, 1.0, ""});
        cards.push_back({"CDELT" + number, 1.0, ""});
    };
    add("3", "CHANNEL", "counts the channels, see CHANn and FREQn");
    if (!study.polarized) return;
    add("4", "STOKES", "1 I, 2 Q, 3 U");
    cards.push_back({"POLCCONV", study.convention == PolarizationConvention::Cosmo ? "COSMO" : "IAU",
                     "against the meridian of each pixel"});
}

FitsImageLayout make_layout(const Plan& plan, const PatchSpec& patch, int realization, int seam,
                            const std::vector<std::string>& labels) {
    const StudySpec& study = plan.study;
    FitsImageLayout layout;
    layout.axes = {patch.pixels, patch.pixels, static_cast<std::int64_t>(plan.channels.size())};
    if (study.polarized) layout.axes.push_back(3);
    layout.float64 = study.precision == MapPrecision::Float64;
    auto& cards = layout.cards;
    cards.push_back({"BUNIT", to_text(study.unit), "unit of the values"});
    if (study.unit.kind == BrightnessUnit::Kind::RayleighJeans)
        cards.push_back({"KSCALE", "RJ", "kelvin of Rayleigh-Jeans brightness"});
    if (study.unit.kind == BrightnessUnit::Kind::Thermodynamic)
        cards.push_back({"KSCALE", "CMB", "kelvin of the CMB, linearised"});
    add_sky_axes(study, patch, cards);
    add_cube_axes(study, cards);
    for (std::size_t c = 0; c < plan.channels.size() && c < 9999; ++c) {
        const std::string number = std::to_string(c + 1);
        cards.push_back({"CHAN" + number, plan.channels[c].name, ""});
        cards.push_back({"FREQ" + number, plan.channels[c].reference.hz(), "[Hz]"});
        if (plan.channels[c].beam_fwhm)
            cards.push_back({"BEAM" + number, plan.channels[c].beam_fwhm->degrees(), "[deg] FWHM"});
    }
    if (seam > 0)
        cards.push_back({"SPHEREL", static_cast<std::int64_t>(seam), "last l of the sphere's draw"});
    cards.push_back({"PERIODIC", false, "cut from a torus 1.5 times as wide"});
    cards.push_back({"APODIZED", false, "no taper towards the edges"});
    cards.push_back({"CREATOR", "Foreglow " + version(), "program that made this image"});
    cards.push_back({"SKYMODEL", plan.model.name, "model of the sky"});
    for (const std::string& label : labels)
        cards.push_back({"SKYNOTE", label.substr(0, 66), ""});
    cards.push_back({"SEED", static_cast<std::int64_t>(study.seed), "of the study's random parts"});
    cards.push_back({"REALIZ", static_cast<std::int64_t>(realization), "realization"});
    return layout;
}

/// Turns a patch's sky into the values of a file, [stokes][channel][n][n].
class PatchCube {
  public:
    PatchCube(const Plan& plan, const PatchSpec& patch, const PatchMaker& maker)
        : plan_(plan),
          maker_(maker),
          beam_(maker.frame().pixels(), patch.pixel),
          inner_(static_cast<std::size_t>(patch.pixels)),
          outer_(static_cast<std::size_t>(maker.frame().pixels())),
          stokes_(plan.study.polarized ? 3 : 1),
          values_(inner_ * inner_ * plan.channels.size() * stokes_) {}

    [[nodiscard]] std::vector<double> make(const SkyModel& whole, const PatchSky& sky) {
        std::vector<BandSum> bands;
        bands.reserve(plan_.channels.size());
        for (const Channel& channel : plan_.channels)
            bands.push_back(channel.band);
        const PixelRoute route(whole, bands, plan_.study.polarized, law_tolerance);
        for (std::size_t c = 0; c < bands.size(); ++c) {
            check_interrupt();
            add_channel(route, sky, c);
        }
        return std::move(values_);
    }

  private:
    void add_channel(const PixelRoute& route, const PatchSky& sky, std::size_t channel) {
        const std::size_t n = outer_ * outer_;
        std::array<std::vector<double>, 3> images;
        std::array<std::span<double>, 3> views;
        for (std::size_t s = 0; s < stokes_; ++s) {
            images[s].resize(n);
            views[s] = images[s];
        }
        route.make_pixels(sky.values, channel, 0, n, {views.data(), stokes_});
        if (plan_.channels[channel].beam)
            for (std::size_t s = 0; s < stokes_; ++s)
                beam_.apply(plan_.channels[channel], images[s]);
        if (stokes_ == 3) turn_to_meridians(images[1], images[2]);
        const std::size_t margin = (outer_ - inner_) / 2;
        for (std::size_t s = 0; s < stokes_; ++s) {
            double* to = values_.data() + (s * plan_.channels.size() + channel) * inner_ * inner_;
            for (std::size_t y = 0; y < inner_; ++y)
                for (std::size_t x = 0; x < inner_; ++x) {
                    const std::size_t from = (y + margin) * outer_ + x + margin;
                    const bool defined = sky.undefined.empty() || !sky.undefined[from];
                    to[y * inner_ + x] = defined ? images[s][from] : undefined_pixel;
                }
        }
    }

    void turn_to_meridians(std::vector<double>& q, std::vector<double>& u) const {
        const double sign = plan_.study.convention == PolarizationConvention::Iau ? -1.0 : 1.0;
        const auto& turns = maker_.turns();
        for (std::size_t i = 0; i < q.size(); ++i) {
            const double c = std::cos(2 * turns[i]), s = std::sin(2 * turns[i]);
            const double plane_q = q[i], plane_u = u[i];
            q[i] = c * plane_q - s * plane_u;
            u[i] = sign * (s * plane_q + c * plane_u);
        }
    }

    const Plan& plan_;
    const PatchMaker& maker_;
    PatchBeam beam_;
    std::size_t inner_, outer_, stokes_;
    std::vector<double> values_;
};

}  // namespace

int patch_margin(const Plan& plan, const PatchSpec& patch) {
    double widest = 0;
    for (const Channel& channel : plan.channels)
        widest = std::max(widest, fwhm_of(channel, plan.study.nside));
    return static_cast<int>(std::ceil(margin_in_sigma * sigma_of(widest) / patch.pixel.radians()));
}

PatchWriter::PatchWriter(const Plan& plan, const DetailedSky& sky, Progress& progress) : plan_(plan) {
    if (plan.study.patches.empty()) return;
    progress.begin("preparing the patches");
    const auto alms = std::make_shared<const TemplateAlms>(analyse_template(sky, plan.study.polarized));
    for (const PatchSpec& patch : plan.study.patches)
        makers_.push_back(std::make_unique<PatchMaker>(sky, alms, patch, plan.study.frame,
                                                       patch_margin(plan, patch), plan.study.polarized));
    progress.end();
}

PatchWriter::~PatchWriter() = default;

void PatchWriter::write(int realization, const SkyModel& whole, OutputFolder& folder,
                        MakeResult& result) const {
    for (std::size_t p = 0; p < makers_.size(); ++p) {
        check_interrupt();
        const PatchSpec& patch = plan_.study.patches[p];
        const PatchSky sky = makers_[p]->make(realization, whole);
        const std::vector<double> values = PatchCube(plan_, patch, *makers_[p]).make(whole, sky);
        const std::string name = "patches/" + map_stem(plan_, patch.name, realization) + ".fits";
        write_fits_image(folder.prepare(name),
                         make_layout(plan_, patch, realization, makers_[p]->seam(), whole.labels), values);
        result.outputs.push_back(name);
    }
}

void list_patches(Plan& plan) {
    const StudySpec& study = plan.study;
    if (study.patches.empty()) return;
    if (study.unit.kind == BrightnessUnit::Kind::JanskyPerPixel)
        throw InputError(
            study.patches.front().place +
            ": a [[patch]] has pixels of its own, so the study's unit must not be Jy/pixel: set `unit = "
            "\"MJy/sr\"`");
    for (const PatchSpec& patch : study.patches) {
        const std::int64_t wide = patch.pixels + 2LL * patch_margin(plan, patch);
        if (wide > PatchSpec::most_pixels)
            throw InputError(patch.place + ": the patch '" + patch.name + "' has " +
                             std::to_string(patch.pixels) + " pixels a side and wants " +
                             std::to_string(wide) +
                             " with the margin of its channels' widest beam, and at most " +
                             std::to_string(PatchSpec::most_pixels) +
                             " can be made: take a larger pixel, a smaller size, or narrower beams");
        const FitsImageLayout layout = make_layout(plan, patch, 0, 0, {});
        for (const int r : plan.realizations)
            plan.files.push_back({"patches/" + map_stem(plan, patch.name, r) + ".fits",
                                  std::to_string(patch.pixels) + " x " + std::to_string(patch.pixels) +
                                      " pixels of " + to_text(patch.pixel) + ", every channel",
                                  fits_image_file_bytes(layout)});
    }
}

}  // namespace foreglow
