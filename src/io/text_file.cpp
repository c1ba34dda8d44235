// SPDX-License-Identifier: GPL-2.0-or-later
#include "io/text_file.h"

#include <array>
#include <cerrno>
#include <cstdio>
#include <cstring>
#include <memory>
#include <system_error>

#include "base/error.h"

namespace foreglow {
namespace {

constexpr std::size_t largest_text = std::size_t{64} * 1024 * 1024;

struct CloseFile {
    void operator()(std::FILE* file) const noexcept { std::fclose(file); }
};

}  // namespace

std::string to_one_line(std::string text) {
    for (char& c : text)
        if (static_cast<unsigned char>(c) < 0x20 || c == 0x7f) c = ' ';
    return text;
}

std::string read_text_file(const std::filesystem::path& path, const std::string& what) {
    const std::string name = what + " '" + path.string() + "'";
    std::error_code code;
    const auto status = std::filesystem::status(path, code);
    if (status.type() == std::filesystem::file_type::not_found)
        throw InputError(to_one_line(name + " does not exist: check the path"));
    if (std::filesystem::is_directory(status))
        throw InputError(to_one_line(name + " is a folder: give the path of a file"));
    const std::unique_ptr<std::FILE, CloseFile> file(std::fopen(path.c_str(), "rb"));
    if (!file) throw FileError(to_one_line(name + " cannot be opened: " + std::strerror(errno)));
    std::string text;
    std::array<char, 65536> buffer{};
    while (const std::size_t count = std::fread(buffer.data(), 1, buffer.size(), file.get())) {
        text.append(buffer.data(), count);
        if (text.size() > largest_text)
            throw DataError(to_one_line(name + " is larger than 64 MiB: is it the right file?"));
    }
    if (std::ferror(file.get()) != 0)
        throw FileError(to_one_line(name + " cannot be read: " + std::strerror(errno)));
    if (text.starts_with("\xEF\xBB\xBF")) text.erase(0, 3);
    return text;
}

}  // namespace foreglow
