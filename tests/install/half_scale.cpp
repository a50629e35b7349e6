// SPDX-License-Identifier: GPL-3.0-or-later
// Measures a recording that it writes itself, a constant envelope of half of full scale, with the
// installed library: 20 log10(1/2) = -6.0206 dBFS. Says what it found; fails where that is not so.
#include <cmath>
#include <complex>
#include <cstdio>
#include <fstream>
#include <numbers>
#include <vector>

#include <tonewalk/base/error.hpp>
#include <tonewalk/base/quantity.hpp>
#include <tonewalk/meter/raw_watch.hpp>
#include <tonewalk/recording/convert.hpp>
#include <tonewalk/recording/stream.hpp>

namespace {

constexpr std::size_t samples = 4800;

void write_half_scale(const char* path) {
    std::ofstream file{path, std::ios::binary};
    for (std::size_t n = 0; n < samples; ++n) {
        const auto angle =
            static_cast<float>(2.0 * std::numbers::pi * static_cast<double>(n) / 48.0);
        const std::complex<float> sample =
            0.5F * std::complex<float>{std::cos(angle), std::sin(angle)};
        file.write(reinterpret_cast<const char*>(&sample), sizeof sample);
    }
}

tonewalk::raw_result measure(const char* path) {
    tonewalk::recording_request request;
    request.path = path;
    request.format = tonewalk::parse_sample_format("cf32_le");
    request.rate_hz = tonewalk::parse_hz("48k", "--rate");
    const auto source = tonewalk::open_recording(request);

    const auto frames = source->opening(samples);
    std::vector<tonewalk::cf32> converted(samples);
    tonewalk::raw_counts counts;
    counts.cells.resize(1);
    tonewalk::sample_converter{source->facts()}.convert(frames, converted, 0, samples, counts);

    tonewalk::raw_watch watch{source->facts()};
    watch.add(counts, samples);
    return watch.result();
}

} // namespace

int main(int argc, char** argv) {
    if (argc != 2) {
        std::fputs("half_scale FILE: writes FILE and measures it\n", stderr);
        return 2;
    }
    try {
        write_half_scale(argv[1]);
        const tonewalk::raw_result found = measure(argv[1]);
        std::printf("%.4f dBFS over %lld samples\n", found.rms_dbfs,
                    static_cast<long long>(found.samples));
        return std::abs(found.rms_dbfs - 20.0 * std::log10(0.5)) < 1e-5 ? 0 : 1;
    } catch (const tonewalk::error& problem) {
        std::fprintf(stderr, "%s\n", problem.what());
        return problem.exit_status();
    }
}
