// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <ostream>
#include <sstream>

namespace foreglow {

/// Keeps a stream's text from coming out while it lives: HEALPix C++ prints counters and its errors by
/// itself.
class SilencedStream {
  public:
    explicit SilencedStream(std::ostream& stream) : stream_(stream), before_(stream.rdbuf(sink_.rdbuf())) {}
    SilencedStream(const SilencedStream&) = delete;
    SilencedStream& operator=(const SilencedStream&) = delete;
    ~SilencedStream() { stream_.rdbuf(before_); }

  private:
    std::ostream& stream_;
    std::ostringstream sink_;
    std::streambuf* before_;
};

}  // namespace foreglow
