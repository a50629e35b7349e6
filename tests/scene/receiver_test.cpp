// SPDX-License-Identifier: GPL-3.0-or-later
#include <algorithm>
#include <cmath>
#include <vector>

#include <gtest/gtest.h>

#include "projection.hpp"
#include "tonewalk/scene/generator.hpp"

namespace {

using namespace tonewalk;
using test::db;
using test::line;

scene quiet_carrier(double level_dbfs, scene_receiver receiver) {
    return {.samples = 48000,
            .carriers = {{.offset_hz = 3000.0, .level_dbfs = level_dbfs}},
            .receiver = std::move(receiver)};
}

TEST(ReceiverNoise, IsWhiteWithTheStatedDensity) {
    const std::vector<cf64> made =
        render_samples({.rate_hz = 1e6, .samples = 1000000, .receiver = {.noise_dbfs_hz = -90.0}});
    const double variance = 1e6 * 1e-9;
    EXPECT_NEAR(test::mean_power(made) / variance, 1.0, 5e-3); // 5 standard errors
    double in_phase = 0.0, across = 0.0;
    cf64 lag{}, mean{};
    for (std::size_t k = 1; k < made.size(); ++k) {
        in_phase += made[k].real() * made[k].real();
        across += made[k].real() * made[k].imag();
        lag += made[k] * std::conj(made[k - 1]);
        mean += made[k];
    }
    EXPECT_NEAR(in_phase / 1e6 / variance, 0.5, 3.6e-3);
    EXPECT_NEAR(across / 1e6 / variance, 0.0, 2.5e-3);
    EXPECT_NEAR(std::abs(lag) / 1e6 / variance, 0.0, 5e-3);
    EXPECT_NEAR(std::abs(mean) / 1e6 / std::sqrt(variance), 0.0, 5e-3);
}

// A real sample r counts as 2r of the analytic signal, over half the rate: density 4 var(r) / rate.
TEST(ReceiverNoise, HasTheStatedDensityInRealSamplesToo) {
    const scene whole{.format = {.type = sample_type::f64, .is_complex = false},
                      .rate_hz = 1e6,
                      .samples = 1000000,
                      .receiver = {.noise_dbfs_hz = -90.0}};
    double square = 0.0;
    for (const cf64& z : render_samples(whole))
        square += z.real() * z.real();
    EXPECT_NEAR(4.0 * square / 1e6 / 1e6 / 1e-9, 1.0, 7.1e-3);
}

// Definition: I = cos, Q = sin(wt + e), 20 log gI/gQ.
TEST(IqErrors, AreTheStatedOnesByMomentsAndKeepTheWantedLine) {
    const std::vector<cf64> made =
        render_samples(quiet_carrier(-6.0, {.iq_gain_error_db = 1.0, .iq_phase_error_deg = 5.0}));
    double ii = 0.0, qq = 0.0, iq = 0.0;
    for (const cf64& z : made) {
        ii += z.real() * z.real();
        qq += z.imag() * z.imag();
        iq += z.real() * z.imag();
    }
    EXPECT_NEAR(10.0 * std::log10(ii / qq), 1.0, 1e-9);
    EXPECT_NEAR(std::asin(iq / std::sqrt(ii * qq)) * 180.0 / M_PI, 5.0, 1e-9);
    EXPECT_NEAR(db(std::abs(line(made, 48000.0, 3000.0))), -6.0, 1e-9);
    const double ratio = std::pow(10.0, 1.0 / 20.0), e = 5.0 * M_PI / 180.0;
    const double image =
        std::abs(ratio - std::polar(1.0, -e)) / std::abs(ratio + std::polar(1.0, e));
    EXPECT_NEAR(db(std::abs(line(made, 48000.0, -3000.0))), -6.0 + db(image), 1e-9);
}

TEST(Receiver, AddsDcAndSpursAfterItsGain) {
    const std::vector<cf64> made = render_samples(quiet_carrier(
        -20.0, {.gain_steps = {{-1.0, -10.0}},
                .dc_dbfs = -30.0,
                .dc_phase_deg = 60.0,
                .spurs = {{.offset_hz = -7000.0, .level_dbfs = -50.0, .phase_deg = 20.0}}}));
    EXPECT_NEAR(db(std::abs(line(made, 48000.0, 3000.0))), -30.0, 1e-9);
    EXPECT_NEAR(db(std::abs(line(made, 48000.0, 0.0))), -30.0, 1e-9);
    EXPECT_NEAR(std::arg(line(made, 48000.0, 0.0)) * 180.0 / M_PI, 60.0, 1e-9);
    EXPECT_NEAR(db(std::abs(line(made, 48000.0, -7000.0))), -50.0, 1e-9);
    EXPECT_NEAR(std::arg(line(made, 48000.0, -7000.0)) * 180.0 / M_PI, 20.0, 1e-9);
}

TEST(Receiver, GainStepsMoveSignalAndNoiseAlike) {
    scene whole = quiet_carrier(-20.0, {.noise_dbfs_hz = -80.0});
    const std::vector<cf64> plain = render_samples(whole);
    whole.receiver.gain_steps = {{0.25, -6.0}, {0.5, 3.0}};
    const std::vector<cf64> stepped = render_samples(whole);
    const double gains_db[] = {0.0, -6.0, 3.0, 3.0};
    for (std::size_t k = 0; k < 48000; k += 999) {
        const double gain = std::pow(10.0, gains_db[k / 12000] / 20.0);
        EXPECT_NEAR(std::abs(stepped[k] - gain * plain[k]), 0.0, 1e-15);
    }
}

TEST(GainControl, SettlesAtItsTargetWithItsTimeConstant) {
    scene whole = quiet_carrier(
        -40.0, {.gain_control = scene_gain_control{
                    .target_dbfs = -20.0, .attack_s = 0.005, .release_s = 0.05, .begin_db = 19.9}});
    whole.carriers[0].fades = {{0.49999, 0.0}, {0.5, 0.1}};
    const std::vector<cf64> made = render_samples(whole);
    const auto excess_db = [&](double time_s) {
        return db(std::abs(made[static_cast<std::size_t>(time_s * 48000.0)])) + 20.0;
    };
    EXPECT_NEAR(excess_db(0.0), -0.1, 1e-6);
    EXPECT_NEAR(excess_db(0.05), -0.1 / M_E, 3e-3); // one release time later
    EXPECT_NEAR(excess_db(0.49), 0.0, 1e-4);        // settled
    EXPECT_NEAR(excess_db(0.505), 0.1 / M_E, 3e-3); // one attack time after the rise
    EXPECT_NEAR(excess_db(0.9), 0.0, 1e-6);
}

TEST(Compression, IsOneDecibelAtTheStatedLevel) {
    const auto loss_db = [](double level_dbfs) {
        return level_dbfs - db(std::abs(render_samples(
                                quiet_carrier(level_dbfs, {.compression_dbfs = -3.0}))[100]));
    };
    EXPECT_NEAR(loss_db(-3.0), 1.0, 1e-9);
    EXPECT_NEAR(loss_db(-23.0), 0.0112, 1e-4); // 10 log(1 + 0.259/100)
    EXPECT_GT(loss_db(7.0), 5.0);
}

TEST(Clipping, HoldsEachComponent) {
    const std::vector<cf64> made = render_samples(quiet_carrier(0.0, {.clip_dbfs = -6.0}));
    const double limit = std::pow(10.0, -6.0 / 20.0);
    std::size_t held = 0;
    for (const cf64& z : made) {
        ASSERT_LE(std::abs(z.real()), limit * (1.0 + 1e-15));
        ASSERT_LE(std::abs(z.imag()), limit * (1.0 + 1e-15));
        held += std::abs(z.real()) > limit * (1.0 - 1e-12) ? 1U : 0U;
    }
    // |cos| above 0.501 two thirds of the time.
    EXPECT_NEAR(static_cast<double>(held) / 48000.0, 2.0 * std::acos(limit) / M_PI, 0.07);
}

} // namespace
