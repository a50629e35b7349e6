// SPDX-License-Identifier: GPL-3.0-or-later
#include <cmath>
#include <cstring>
#include <fstream>
#include <string>
#include <vector>

#include <gtest/gtest.h>

#include "support/run_command.hpp"
#include "support/temporary_folder.hpp"
#include "tonewalk/scene/generator.hpp"

namespace {

using namespace tonewalk;

void write_bytes(const std::filesystem::path& path, const void* data, std::size_t size) {
    test::write_file(path, {static_cast<const char*>(data), size});
}

// Python's struct module is the other implementation: it unpacks the bytes by its own rules, and
// Python's round() is half to even.
constexpr const char* unpacking = R"(
import struct, sys
name, bits = sys.argv[1], int(sys.argv[2])
doubles = open('truth.f64', 'rb').read()
truth = [x[0] for x in struct.iter_unpack('<d', doubles)]
if name[0] == 'r':
    truth = truth[::2]
letter = {'f32': 'f', 'f64': 'd', 'i32': 'i', 'i16': 'h', 'u32': 'I', 'u16': 'H', 'i8': 'b', 'u8': 'B'}[name[1:].split('_')[0]]
order = '>' if name.endswith('_be') else '<'
stored = [x[0] for x in struct.iter_unpack(order + letter, open('stored', 'rb').read())]
assert len(stored) == len(truth), (len(stored), len(truth))
half = 2 ** (bits - 1)
for got, x in zip(stored, truth):
    if letter == 'd':
        want = x
    elif letter == 'f':
        want = struct.unpack('<f', struct.pack('<f', x))[0]
    else:
        want = min(max(round(x * half), -half), half - 1) + (half if letter.isupper() else 0)
    assert got == want, (got, want, x)
)";

TEST(OutsideStoring, EveryFormatUnpacksToTheRoundedSamples) {
    const test::temporary_folder folder;
    test::write_file(folder / "unpack.py", unpacking);
    for (const char* name :
         {"cf32_le", "cf32_be", "cf64_le", "cf64_be", "ci32_le", "ci32_be", "ci16_le",
          "ci16_be", "cu32_le", "cu32_be", "cu16_le", "cu16_be", "ci8",     "cu8",
          "rf32_le", "rf32_be", "rf64_le", "rf64_be", "ri32_le", "ri32_be", "ri16_le",
          "ri16_be", "ru32_le", "ru32_be", "ru16_le", "ru16_be", "ri8",     "ru8"}) {
        const auto format = parse_sample_format(name);
        ASSERT_TRUE(format) << name;
        const scene whole{.format = *format,
                          .samples = 3001,
                          .carriers = {{.offset_hz = 12345.0,
                                        .level_dbfs = -1.0, // overdriven: peaks at +3.5 dBFS
                                        .tones = {{.depth_percent = 70.0}}}}};
        const std::vector<std::byte> stored = render_bytes(whole);
        const std::vector<cf64> truth = render_samples(whole);
        write_bytes(folder / "stored", stored.data(), stored.size());
        write_bytes(folder / "truth.f64", truth.data(), truth.size() * sizeof(cf64));
        const test::command_result run =
            test::run_command("cd " + test::shell_quoted(folder.path().string()) +
                              " && " TONEWALK_TEST_PYTHON " unpack.py " + name + " " +
                              std::to_string(8 * format->component_bytes()));
        EXPECT_EQ(run.status, 0) << name << ": " << run.output;
    }
}

TEST(Storing, HalvesGoToTheEvenCode) {
    // DC alone, on I and Q: 0.5, 1.5, 2.5 and -0.5 steps of 16 bits.
    const auto code = [](double steps) {
        const double amplitude = std::sqrt(2.0) * std::fabs(steps) / 32768.0;
        const std::vector<std::byte> bytes =
            render_bytes({.samples = 1,
                          .receiver = {.dc_dbfs = 20.0 * std::log10(amplitude),
                                       .dc_phase_deg = steps < 0.0 ? -135.0 : 45.0}});
        std::int16_t in_phase = 0;
        std::memcpy(&in_phase, bytes.data(), sizeof in_phase);
        return in_phase;
    };
    // A level in dB cannot name a half exactly: a hair to either side decides.
    EXPECT_EQ(code(0.499999), 0);
    EXPECT_EQ(code(0.500001), 1);
    EXPECT_EQ(code(1.499999), 1);
    EXPECT_EQ(code(2.500001), 3);
    EXPECT_EQ(code(-0.499999), 0);
    EXPECT_EQ(code(-0.500001), -1);
}

TEST(Storing, ConverterNoiseHasTheStatedRms) {
    const scene whole{.samples = 500000, .receiver = {.noise_lsb_rms = 2.0}};
    const std::vector<std::byte> bytes = render_bytes(whole);
    std::vector<std::int16_t> codes(bytes.size() / 2);
    std::memcpy(codes.data(), bytes.data(), bytes.size());
    double square = 0.0;
    for (const std::int16_t code : codes)
        square += code * code;
    // Rounding adds 1/12 of a step squared; 1e6 values, standard error sqrt(2/n) of the variance.
    EXPECT_NEAR(square / static_cast<double>(codes.size()), 4.0 + 1.0 / 12.0, 4.5 * 4.0 * 1.5e-3);
}

TEST(Storing, NonFiniteSamplesStandWhereTheyAreAsked) {
    const scene whole{
        .format = {.type = sample_type::f32},
        .samples = 3000,
        .receiver = {
            .non_finite = {
                {.first = 1022, .count = 4},
                {.first = 2000, .value = scene_non_finite::kind::infinity},
                {.first = 2999, .count = 5, .value = scene_non_finite::kind::minus_infinity}}}};
    const std::vector<std::byte> bytes = render_bytes(whole);
    std::vector<float> values(6000);
    std::memcpy(values.data(), bytes.data(), bytes.size());
    for (std::size_t k = 0; k < values.size(); ++k) {
        const std::size_t sample = k / 2;
        if (sample >= 1022 && sample < 1026)
            EXPECT_TRUE(std::isnan(values[k])) << sample;
        else if (sample == 2000 || sample == 2999)
            EXPECT_EQ(values[k], sample == 2000 ? INFINITY : -INFINITY);
        else
            EXPECT_EQ(values[k], 0.0F) << sample;
    }
}

} // namespace
