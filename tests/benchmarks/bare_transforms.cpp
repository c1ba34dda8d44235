// SPDX-License-Identifier: GPL-2.0-or-later
#include "bare_transforms.h"

#include <libsharp/sharp.h>
#include <libsharp/sharp_almhelpers.h>
#include <libsharp/sharp_geomhelpers.h>

#include <array>
#include <random>

namespace foreglow::benchmarks {

struct BareTransforms::Impl {
    sharp_geom_info* geometry = nullptr;
    sharp_alm_info* triangle = nullptr;
    std::array<std::vector<double>, 2> maps;
    std::array<std::vector<std::complex<double>>, 2> alms;

    void execute(sharp_jobtype job, int spin) {
        void* alm[] = {alms[0].data(), alms[1].data()};
        void* map[] = {maps[0].data(), maps[1].data()};
        sharp_execute(job, spin, static_cast<void*>(alm), static_cast<void*>(map), geometry, triangle,
                      SHARP_DP, nullptr, nullptr);
    }
};

BareTransforms::BareTransforms(int nside, int lmax) : impl_(std::make_unique<Impl>()) {
    sharp_make_healpix_geom_info(nside, 1, &impl_->geometry);
    sharp_make_triangular_alm_info(lmax, lmax, 1, &impl_->triangle);
    std::mt19937 random(1);
    std::uniform_real_distribution<double> uniform(-1, 1);
    for (std::size_t i = 0; i < 2; ++i) {
        impl_->maps[i].resize(12UL * static_cast<std::size_t>(nside) * static_cast<std::size_t>(nside));
        impl_->alms[i].resize((static_cast<std::size_t>(lmax) + 1) * (static_cast<std::size_t>(lmax) + 2) /
                              2);
        for (double& value : impl_->maps[i])
            value = uniform(random);
        for (auto& value : impl_->alms[i])
            value = {uniform(random), uniform(random)};
    }
}

BareTransforms::~BareTransforms() {
    sharp_destroy_geom_info(impl_->geometry);
    sharp_destroy_alm_info(impl_->triangle);
}

void BareTransforms::analyse() {
    impl_->execute(SHARP_MAP2ALM, 0);
}
void BareTransforms::analyse_spin2() {
    impl_->execute(SHARP_MAP2ALM, 2);
}
void BareTransforms::synthesize() {
    impl_->execute(SHARP_ALM2MAP, 0);
}
void BareTransforms::synthesize_spin2() {
    impl_->execute(SHARP_ALM2MAP, 2);
}

}  // namespace foreglow::benchmarks
