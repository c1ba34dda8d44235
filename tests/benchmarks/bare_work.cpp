// SPDX-License-Identifier: GPL-2.0-or-later
// Does only what nobody can do without: so many transforms, so much reading and writing; prints the seconds
// of each as JSON. Usage: bare_work NAME=NUMBER... [read=FILE...] with nside, lmax, threads, analyses,
// analyses2, syntheses, syntheses2, files, bytes (of each file), sync (0 or 1), and folder=DIR for the files,
// which are deleted at the end.
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

double seconds_of(const std::function<void()>& work) {
    const auto start = std::chrono::steady_clock::now();
    work();
    return std::chrono::duration<double>(std::chrono::steady_clock::now() - start).count();
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

double time_transforms(const Request& request) {
    if (request["nside"] == 0) return 0;
    BareTransforms transforms(static_cast<int>(request["nside"]), static_cast<int>(request["lmax"]));
    return seconds_of([&] {
        for (long i = 0; i < request["analyses"]; ++i)
            transforms.analyse();
        for (long i = 0; i < request["analyses2"]; ++i)
            transforms.analyse_spin2();
        for (long i = 0; i < request["syntheses"]; ++i)
            transforms.synthesize();
        for (long i = 0; i < request["syntheses2"]; ++i)
            transforms.synthesize_spin2();
    });
}

double time_writing(const Request& request) {
    const auto name = [&](std::int64_t i) { return request.folder + "/raw" + std::to_string(i); };
    const double seconds = seconds_of([&] {
        foreglow::parallel_for_blocks(request["files"], 1, [&](std::int64_t begin, std::int64_t) {
            write_raw_file(name(begin), request["bytes"], request["sync"] != 0);
        });
    });
    for (long i = 0; i < request["files"]; ++i)
        std::filesystem::remove(name(i));
    return seconds;
}

double time_reading(const Request& request) {
    return seconds_of([&] {
        for (const auto& path : request.inputs)
            if (read_raw_file(path).empty()) throw std::runtime_error("empty file " + path);
    });
}

}  // namespace

int main(int argc, char** argv) {
    try {
        const Request request = read_request(argc, argv);
        foreglow::set_thread_count(static_cast<int>(request["threads"]));
        const double reading = time_reading(request), transforms = time_transforms(request),
                     writing = time_writing(request);
        std::cout << "{\"reading\": " << reading << ", \"transforms\": " << transforms
                  << ", \"writing\": " << writing << "}\n";
    } catch (const std::exception& error) {
        std::cerr << "bare_work: " << error.what() << '\n';
        return EXIT_FAILURE;
    }
    return EXIT_SUCCESS;
}
