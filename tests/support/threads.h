// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include "base/parallel.h"

namespace foreglow::testing {

/// Sets the number of threads and puts the old one back.
class Threads {
  public:
    explicit Threads(int count) : before_(thread_count()) { set_thread_count(count); }
    ~Threads() { set_thread_count(before_); }
    Threads(const Threads&) = delete;
    Threads& operator=(const Threads&) = delete;

  private:
    int before_;
};

}  // namespace foreglow::testing
