// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <gtest/gtest.h>

#include <cmath>
#include <complex>
#include <cstdlib>
#include <fstream>
#include <map>
#include <string>
#include <vector>

#include "base/parallel.h"
#include "base/text.h"
#include "sphere/alm.h"
#include "sphere/grid.h"
#include "sphere/harmonics.h"

namespace foreglow::reference {

/// The columns of tests/oracle/sphere_NAME.csv, which sphere_reference.py makes.
inline std::map<std::string, std::vector<double>> read_table(const std::string& name) {
    std::string path = FOREGLOW_TESTS_DIR;
    path.append("/oracle/sphere_").append(name).append(".csv");  // a chain of + makes g++ 12 see a fault
    std::ifstream in(path);
    std::string line;
    std::map<std::string, std::vector<double>> out;
    if (!std::getline(in, line)) {
        ADD_FAILURE() << "no table sphere_" << name << ".csv";
        return out;
    }
    const auto names = split(line, ',');
    while (std::getline(in, line)) {
        const auto cells = split(line, ',');
        for (std::size_t i = 0; i < names.size(); ++i)
            out[names[i]].push_back(std::strtod(cells.at(i).c_str(), nullptr));
    }
    return out;
}

/// The closed_alm of sphere_reference.py.
inline Alm closed_alm(int lmax, double shift, int first_l = 0) {
    Alm out(lmax);
    for (int m = 0; m <= lmax; ++m)
        for (int l = std::max(m, first_l); l <= lmax; ++l) {
            const double size = std::pow(l + 1.0, -1.5);
            out(l, m) = {size * std::cos(3.0 * l + 5.0 * m + shift),
                         m > 0 ? size * std::sin(2.0 * l + 7.0 * m + shift) : 0.0};
        }
    return out;
}

inline AlmEB closed_alm_eb(int lmax) {
    return {closed_alm(lmax, 1.0, 2), closed_alm(lmax, 2.0, 2)};
}

/// The rough_maps of sphere_reference.py.
struct RoughMaps {
    std::vector<double> i, q, u;
};
inline RoughMaps rough_maps(const HealpixGrid& grid) {
    RoughMaps out;
    for (std::int64_t p = 0; p < grid.npix(); ++p) {
        const auto [x, y, z] = grid.direction(p);
        out.i.push_back(std::exp(2 * x + y) + 3 * std::abs(z));
        out.q.push_back(std::cos(3 * x) * (1 - z * z) + 0.2 * y);
        out.u.push_back(std::sin(2 * y) * z * (1 - z * z));
    }
    return out;
}

inline double largest_difference(std::span<const Alm::Value> a, std::span<const Alm::Value> b) {
    EXPECT_EQ(a.size(), b.size());
    double worst = 0;
    for (std::size_t i = 0; i < a.size(); ++i)
        worst = std::max(worst, std::abs(a[i] - b[i]));
    return worst;
}

inline double largest_difference(std::span<const double> a, std::span<const double> b) {
    EXPECT_EQ(a.size(), b.size());
    double worst = 0;
    for (std::size_t i = 0; i < a.size(); ++i)
        worst = std::max(worst, std::abs(a[i] - b[i]));
    return worst;
}

/// Sets the number of threads and puts the old one back.
class Threads {
  public:
    explicit Threads(int count) : before_(thread_count()) { set_thread_count(count); }
    Threads(const Threads&) = delete;
    Threads& operator=(const Threads&) = delete;
    ~Threads() { set_thread_count(before_); }

  private:
    int before_;
};

}  // namespace foreglow::reference
