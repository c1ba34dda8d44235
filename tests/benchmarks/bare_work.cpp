// SPDX-License-Identifier: GPL-2.0-or-later
// Does only what nobody can do without: so many transforms, so much reading and writing; prints
// [seconds, CPU seconds].
//
// Usage: bare_work NAME=NUMBER... [read=FILE...] with nside, lmax, threads, analyses, analyses2, syntheses,
// syntheses2, files, bytes (of each file), sync (0 or 1), and folder=DIR for the files, deleted at the end.
#include <sys/resource.h>

#include <chrono>
#include <cstdlib>
#include <functional>
#include <iostream>
#include <map>
#include <string>

#include "bare_transforms.h"
#include "base/parallel.h"
#include "raw_files.h"

namespace {

using namespace foreglow::benchmarks;

struct Seconds {
    double wall = 0, cpu = 0;
};

Seconds now() {
    rusage usage{};
    getrusage(RUSAGE_SELF, &usage);
    const auto seconds = [](const timeval& time) {
        return static_cast<double>(time.tv_sec) + 1e-6 * static_cast<double>(time.tv_usec);
    };
    const auto wall = std::chrono::steady_clock::now().time_since_epoch();
    return {std::chrono::duration<double>(wall).count(), seconds(usage.ru_utime) + seconds(usage.ru_stime)};
}

void add_time_of(const std::function<void()>& work, Seconds& sum) {
    const Seconds start = now();
    work();
    const Seconds end = now();
    sum.wall += end.wall - start.wall;
    sum.cpu += end.cpu - start.cpu;
}

struct Request {
    std::map<std::string, long> numbers{{"sync", 1}, {"threads", 1}};
    std::string folder = ".";
    std::vector<std::string> inputs;

    [[nodiscard]] long operator[](const std::string& name) const {
        const auto found = numbers.find(name);
        return found == numbers.end() ? 0 : found->second;
    }
};

Request read_request(int argc, char** argv) {
    Request request;
    for (int i = 1; i < argc; ++i) {
        const std::string word = argv[i];
        const auto equals = word.find('=');
        if (equals == std::string::npos) throw std::runtime_error("no '=' in " + word);
        const std::string name = word.substr(0, equals), value = word.substr(equals + 1);
        if (name == "folder")
            request.folder = value;
        else if (name == "read")
            request.inputs.push_back(value);
        else
            request.numbers[name] = std::stol(value);
    }
    return request;
}

void time_transforms(const Request& request, Seconds& sum) {
    if (request["nside"] == 0) return;
    BareTransforms transforms(static_cast<int>(request["nside"]), static_cast<int>(request["lmax"]));
    const auto work = [&] {
        for (long i = 0; i < request["analyses"]; ++i)
            transforms.analyse();
        for (long i = 0; i < request["analyses2"]; ++i)
            transforms.analyse_spin2();
        for (long i = 0; i < request["syntheses"]; ++i)
            transforms.synthesize();
        for (long i = 0; i < request["syntheses2"]; ++i)
            transforms.synthesize_spin2();
    };
    add_time_of(work, sum);
}

void time_writing(const Request& request, Seconds& sum) {
    const auto name = [&](std::int64_t i) { return request.folder + "/raw" + std::to_string(i); };
    const auto work = [&](std::int64_t begin, std::int64_t) {
        write_raw_file(name(begin), request["bytes"], request["sync"] != 0);
    };
    add_time_of([&] { foreglow::parallel_for_blocks(request["files"], 1, work); }, sum);
    for (long i = 0; i < request["files"]; ++i)
        std::filesystem::remove(name(i));
}

void time_reading(const Request& request, Seconds& sum) {
    const auto work = [&] {
        for (const auto& path : request.inputs)
            if (read_raw_file(path).empty()) throw std::runtime_error("empty file " + path);
    };
    add_time_of(work, sum);
}

}  // namespace

int main(int argc, char** argv) {
    try {
        const Request request = read_request(argc, argv);
        foreglow::set_thread_count(static_cast<int>(request["threads"]));
        Seconds sum;
        time_reading(request, sum);
        time_transforms(request, sum);
        time_writing(request, sum);
        std::cout << "[" << sum.wall << ", " << sum.cpu << "]\n";
    } catch (const std::exception& error) {
        std::cerr << "bare_work: " << error.what() << '\n';
        return EXIT_FAILURE;
    }
    return EXIT_SUCCESS;
}
