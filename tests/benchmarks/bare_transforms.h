// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <complex>
#include <memory>
#include <vector>

namespace foreglow::benchmarks {

/// Calls libsharp and nothing else, in double precision on the whole sky: what any program built on it pays
/// for a transform.
///
/// Maps and coefficients are made once, so that no call pays for memory; their values are random numbers of
/// order 1.
class BareTransforms {
  public:
    BareTransforms(int nside, int lmax);
    ~BareTransforms();
    BareTransforms(const BareTransforms&) = delete;
    BareTransforms& operator=(const BareTransforms&) = delete;

    void analyse();           ///< one map to a_lm
    void analyse_spin2();     ///< Q and U to E and B
    void synthesize();        ///< a_lm to one map
    void synthesize_spin2();  ///< E and B to Q and U

  private:
    struct Impl;
    std::unique_ptr<Impl> impl_;
};

}  // namespace foreglow::benchmarks
