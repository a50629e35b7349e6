// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/detect/audio_resampler.hpp"

#include <cstdlib>
#include <fstream>

#include <fmt/format.h>
#include <gtest/gtest.h>

#include "detect/signals.hpp"
#include "support/run_command.hpp"
#include "support/temporary_folder.hpp"

namespace tonewalk {
namespace {

using namespace test;

audio_resampler::config rates(double input_hz, double output_hz) {
    const double lesser = std::min(input_hz, output_hz);
    return {.input_rate_hz = input_hz,
            .output_rate_hz = output_hz,
            .pass_edge_hz = 0.4 * lesser,
            .stop_edge_hz = 0.5 * lesser};
}

std::vector<float> resample(audio_resampler& r, std::span<const float> in, double first = 0.0,
                            std::uint64_t seed = 0) {
    std::vector<float> out;
    r.begin(first);
    if (seed == 0) {
        r.add(in, out);
    } else {
        in_pieces(in, seed, [&](std::span<const float> piece) { r.add(piece, out); });
    }
    r.end(out);
    return out;
}

const std::vector<std::pair<double, double>> odd_rates{{80000.0, 48000.0},
                                                       {81920.7, 48000.0},
                                                       {2.4e6 / 29.0, 44100.0},
                                                       {24000.0, 192000.0},
                                                       {123456.789, 8000.0}};

TEST(AudioResampler, KeepsTonesOfAnyFrequencyWithinAThousandthOfADecibel) {
    random_stream random{5};
    for (const auto& [input_hz, output_hz] : odd_rates) {
        audio_resampler r{rates(input_hz, output_hz)};
        for (int i = 0; i < 4; ++i) {
            const double hz = random.uniform(0.002, 0.4) * std::min(input_hz, output_hz);
            const auto in = real_tone(static_cast<std::size_t>(input_hz), input_hz, hz, 0.5);
            const std::vector<float> out = resample(r, in);
            const auto middle = std::span{out}.subspan(out.size() / 10, out.size() * 8 / 10);
            EXPECT_NEAR(db(windowed_amplitude(middle, output_hz, hz) / 0.5), 0.0, 0.001)
                << input_hz << " to " << output_hz << ", " << hz;
        }
    }
}

TEST(AudioResampler, LeavesNothingButTheToneAboveMinus100Decibel) {
    random_stream random{6};
    for (const auto& [input_hz, output_hz] : odd_rates) {
        audio_resampler r{rates(input_hz, output_hz)};
        const double hz = random.uniform(0.02, 0.4) * std::min(input_hz, output_hz);
        const auto in = real_tone(static_cast<std::size_t>(input_hz), input_hz, hz, 1.0);
        std::vector<float> out = resample(r, in);
        // What is left when the best sine is taken away, per line at most 100 dB down: as a whole
        // too.
        const auto first = out.size() / 10, count = out.size() * 8 / 10;
        double cc = 0.0, cs = 0.0, ss = 0.0, xc = 0.0, xs = 0.0, power = 0.0;
        for (std::size_t n = first; n < first + count; ++n) {
            const double angle = turn * hz / output_hz * static_cast<double>(n);
            const double c = std::cos(angle), s = std::sin(angle), x = static_cast<double>(out[n]);
            cc += c * c, cs += c * s, ss += s * s, xc += x * c, xs += x * s, power += x * x;
        }
        const double determinant = cc * ss - cs * cs;
        const double a = (xc * ss - xs * cs) / determinant, b = (xs * cc - xc * cs) / determinant;
        const double rest = (power - a * xc - b * xs) / power;
        EXPECT_LT(10.0 * std::log10(std::max(rest, 1e-30)), -100.0)
            << input_hz << " to " << output_hz;
    }
}

TEST(AudioResampler, StopsWhatTheOutputRateCannotHold) {
    audio_resampler r{rates(80000.0, 16000.0)};
    for (const double hz : {8000.0, 8300.0, 12000.0, 16010.0, 33333.0}) {
        const std::vector<float> out = resample(r, real_tone(80000, 80000.0, hz, 1.0));
        float highest = 0.0F;
        for (std::size_t n = 1000; n + 1000 < out.size(); ++n) {
            highest = std::max(highest, std::abs(out[n]));
        }
        EXPECT_LT(db(static_cast<double>(highest)), -100.0) << hz;
    }
}

TEST(AudioResampler, PutsEverySampleExactlyInPlace) {
    audio_resampler r{rates(81920.7, 48000.0)};
    const double hz = 1234.5;
    const std::vector<float> out = resample(r, real_tone(163840, 81920.7, hz, 0.8), 100.25);
    for (std::size_t n = 1000; n + 1000 < out.size(); n += 7) {
        const double t = static_cast<double>(n) / 48000.0 + 100.25 / 81920.7;
        ASSERT_NEAR(static_cast<double>(out[n]), 0.8 * std::cos(turn * hz * t), 2e-6) << n;
    }
}

TEST(AudioResampler, DoesNotDriftInAnHour) {
    // 81920.7 = 819207/10: output k stands at input k 819207/480000, in whole numbers.
    audio_resampler r{rates(81920.7, 48000.0)};
    r.begin(0.0);
    __extension__ using wide = unsigned __int128;
    for (const sample_index k : {1LL, 479999LL, 480000LL, 172800000LL, 172800001LL, 8294400000LL}) {
        const fine_position p = r.position(k);
        const auto places = static_cast<wide>(k) * 819207U;
        const auto whole = static_cast<sample_index>(places / 480000U);
        const double fraction = static_cast<double>(places % 480000U) / 480000.0;
        const double seen =
            static_cast<double>(p.whole - whole) + std::ldexp(static_cast<double>(p.fraction), -64);
        // 81920.7 itself is a double, right to 7e-12 Hz.
        EXPECT_NEAR(seen, fraction, 1e-8 + 9e-17 * 1.71 * static_cast<double>(k)) << k;
    }
}

TEST(AudioResampler, GivesTheSameBitsHoweverTheInputIsCut) {
    audio_resampler r{rates(81920.7, 48000.0)};
    const auto in = real_tone(60000, 81920.7, 4321.0, 0.5);
    const std::vector<float> whole = resample(r, in, 0.5);
    EXPECT_EQ(resample(r, in, 0.5, 1), whole);
    EXPECT_EQ(resample(r, in, 0.5, 2), whole);
}

TEST(AudioResampler, GivesOutputsForAsLongAsThereIsInput) {
    audio_resampler r{rates(10000.0, 40000.0)};
    for (const std::size_t size : {0U, 1U, 2U, 5U, 1000U}) {
        EXPECT_EQ(resample(r, std::vector<float>(size, 1.0F)).size(), 4 * size);
    }
    EXPECT_EQ(resample(r, std::vector<float>(1000, 1.0F), 999.8).size(), 1U);
}

// Outside: SoX's `rate -v` on the same tone, 96 to 44.1 kHz, as float WAV without dither.
TEST(OutsideResampling, AgreesWithSox) {
    if (run_command("sox --version").status != 0) {
        ASSERT_EQ(std::getenv("CI"), nullptr) << "SoX is missing";
        GTEST_SKIP() << "SoX is missing";
    }
    const temporary_folder folder;
    const auto in = real_tone(96000, 96000.0, 3217.0, 0.5);
    {
        std::ofstream file{folder / "in.raw", std::ios::binary};
        file.write(reinterpret_cast<const char*>(in.data()),
                   static_cast<std::streamsize>(in.size() * sizeof(float)));
    }
    const auto sox = run_command(
        fmt::format("cd {} && sox -D -t f32 -r 96000 -c 1 in.raw -t f32 out.raw rate -v 44100",
                    folder.path().string()));
    ASSERT_EQ(sox.status, 0) << sox.output;
    const std::string bytes = read_file(folder / "out.raw");
    std::vector<float> theirs(bytes.size() / sizeof(float));
    std::copy_n(bytes.data(), theirs.size() * sizeof(float),
                reinterpret_cast<char*>(theirs.data()));
    audio_resampler r{rates(96000.0, 44100.0)};
    const std::vector<float> ours = resample(r, in);
    ASSERT_EQ(ours.size(), theirs.size());
    for (std::size_t n = 2000; n + 2000 < ours.size(); ++n) {
        ASSERT_NEAR(static_cast<double>(ours[n]), static_cast<double>(theirs[n]), 5e-6) << n;
    }
}

} // namespace
} // namespace tonewalk
