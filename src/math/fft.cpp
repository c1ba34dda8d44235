// SPDX-License-Identifier: GPL-2.0-or-later
#include "math/fft.h"

#include <fftw3.h>

#include "base/error.h"

namespace foreglow {

struct PlaneFourier::Plans {
    fftw_plan forward = nullptr, inverse = nullptr;
    ~Plans() {
        fftw_destroy_plan(forward);
        fftw_destroy_plan(inverse);
    }
};

PlaneFourier::PlaneFourier(int nx, int ny) : nx_(nx), ny_(ny), plans_(std::make_unique<Plans>()) {
    FOREGLOW_EXPECTS(nx >= 1 && ny >= 1);
    // Estimated plans do not depend on timings, so the bits do not either; unaligned ones serve any buffer.
    std::vector<double> image(static_cast<std::size_t>(nx) * static_cast<std::size_t>(ny));
    std::vector<std::complex<double>> transform(static_cast<std::size_t>(ny) * row());
    auto* complex = reinterpret_cast<fftw_complex*>(transform.data());
    constexpr unsigned flags = FFTW_ESTIMATE | FFTW_UNALIGNED;
    plans_->forward = fftw_plan_dft_r2c_2d(ny, nx, image.data(), complex, flags);
    plans_->inverse = fftw_plan_dft_c2r_2d(ny, nx, complex, image.data(), flags);
    FOREGLOW_EXPECTS(plans_->forward != nullptr && plans_->inverse != nullptr);
}

PlaneFourier::~PlaneFourier() = default;

std::vector<std::complex<double>> PlaneFourier::forward(std::span<const double> image) const {
    FOREGLOW_EXPECTS(image.size() == static_cast<std::size_t>(nx_) * static_cast<std::size_t>(ny_));
    std::vector<double> copy(image.begin(), image.end());
    std::vector<std::complex<double>> transform(static_cast<std::size_t>(ny_) * row());
    fftw_execute_dft_r2c(plans_->forward, copy.data(), reinterpret_cast<fftw_complex*>(transform.data()));
    return transform;
}

std::vector<double> PlaneFourier::inverse(std::vector<std::complex<double>> transform) const {
    FOREGLOW_EXPECTS(transform.size() == static_cast<std::size_t>(ny_) * row());
    std::vector<double> image(static_cast<std::size_t>(nx_) * static_cast<std::size_t>(ny_));
    fftw_execute_dft_c2r(plans_->inverse, reinterpret_cast<fftw_complex*>(transform.data()), image.data());
    const double scale = 1 / static_cast<double>(image.size());
    for (double& value : image)
        value *= scale;
    return image;
}

int quick_fft_size(int n) {
    FOREGLOW_EXPECTS(n >= 1);
    for (int size = n;; ++size) {
        int rest = size;
        for (const int prime : {2, 3, 5})
            while (rest % prime == 0)
                rest /= prime;
        if (rest == 1) return size;
    }
}

}  // namespace foreglow
