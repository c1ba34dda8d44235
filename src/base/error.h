// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <stdexcept>
#include <string>

namespace foreglow {

/// Carries one sentence that says what is wrong, where, and what to do; the program's exit status depends on
/// its kind.
class Error : public std::runtime_error {
  public:
    Error(const std::string& message, int exit_status)
        : std::runtime_error(message), exit_status_(exit_status) {}
    /// Returns the exit status that the command ends with: 1 the work failed, 2 the request was wrong, 128 +
    /// n a signal.
    [[nodiscard]] int exit_status() const noexcept { return exit_status_; }

  private:
    int exit_status_;
};

/// Reports a wrong request: a key, a unit or frame left open, an input that does not exist, an output that
/// does. Exit 2.
class InputError : public Error {
  public:
    explicit InputError(const std::string& message) : Error(message, 2) {}
};

/// Reports a file whose content is broken. Exit 1.
class DataError : public Error {
  public:
    explicit DataError(const std::string& message) : Error(message, 1) {}
};

/// Reports that reading or writing failed: disk full, permission, I/O. Exit 1.
class FileError : public Error {
  public:
    explicit FileError(const std::string& message) : Error(message, 1) {}
};

/// Reports arithmetic that did not reach what was asked of it. Exit 1.
class NumericError : public Error {
  public:
    explicit NumericError(const std::string& message) : Error(message, 1) {}
};

/// Reports that a signal asked the program to stop. Exit 128 + signal.
class Interrupted : public Error {
  public:
    explicit Interrupted(int signal) : Error("stopped by a signal", 128 + signal) {}
};

/// Reports a broken contract inside our own code: a fault of the program, never of the user.
class ContractError : public std::logic_error {
  public:
    using std::logic_error::logic_error;
};

[[noreturn]] void fail_contract(const char* condition, const char* file, int line);

}  // namespace foreglow

/// Checks a contract of our own code; always on.
#define FOREGLOW_EXPECTS(condition) \
    ((condition) ? static_cast<void>(0) : ::foreglow::fail_contract(#condition, __FILE__, __LINE__))
