// SPDX-License-Identifier: GPL-2.0-or-later
#include "sphere/ring_weights.h"

#include <error_handling.h>
#include <weight_utils.h>

#include <iostream>
#include <string>

#include "base/error.h"
#include "base/parallel.h"
#include "base/text.h"
#include "sphere/grid.h"
#include "sphere/silenced_stream.h"

namespace foreglow {
namespace {

constexpr int iterations_allowed = 2000;  // nside 8192 and lmax 3 nside need some 200

/// Holds parallel work to one thread: each step is too short to share, and waiting for each other costs many
/// times the work.
class OneThread {
  public:
    OneThread() : before_(thread_count()) { set_thread_count(1); }
    OneThread(const OneThread&) = delete;
    OneThread& operator=(const OneThread&) = delete;
    ~OneThread() { set_thread_count(before_); }

  private:
    int before_;
};

}  // namespace

RingWeights make_ring_weights(int nside, int lmax, double epsilon) {
    FOREGLOW_EXPECTS(is_valid_nside(nside) && lmax >= 0 && epsilon > 0);
    RingWeights out;
    out.nside = nside;
    double reached = 0;
    try {
        const OneThread one_thread;
        const SilencedStream no_counter(std::cout), no_message(std::cerr);
        out.values = get_ringweights(nside, lmax / 2 * 2, epsilon, iterations_allowed, reached);
    } catch (const PlanckError& error) {
        throw NumericError(std::string("the ring weights could not be computed: ") + error.what());
    }
    if (!(reached <= epsilon))
        throw NumericError("the ring weights of nside " + std::to_string(nside) + " up to l = " +
                           std::to_string(lmax) + " did not converge: residual " + format_number(reached, 3));
    for (double& w : out.values)
        w += 1.0;  // the solver gives w - 1
    return out;
}

}  // namespace foreglow
