// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/detect/envelope_detector.hpp"

#include <cstdlib>
#include <fstream>
#include <sstream>

#include <fmt/format.h>
#include <gtest/gtest.h>

#include "detect/signals.hpp"
#include "support/expect_error.hpp"
#include "support/run_command.hpp"
#include "support/temporary_folder.hpp"

namespace tonewalk {
namespace {

using namespace test;

struct waveform {
    double mean, fundamental_over_mean, thd_percent, second_percent;
};

/// Of audio with a 1 kHz tone: twenty cycles from its middle, harmonics up to `highest_hz`.
waveform waveform_of(std::span<const float> audio, double rate_hz, double highest_hz) {
    const auto part = audio.subspan(audio.size() / 4, static_cast<std::size_t>(rate_hz / 50.0));
    double sum = 0.0;
    for (const float sample : part) {
        sum += static_cast<double>(sample);
    }
    const double mean = sum / static_cast<double>(part.size());
    const double fundamental = 2.0 * std::abs(line(part, rate_hz, 1000.0));
    double harmonics = 0.0;
    for (double hz = 2000.0; hz < highest_hz; hz += 1000.0) {
        harmonics += std::norm(2.0 * line(part, rate_hz, hz));
    }
    return {mean, fundamental / mean, 100.0 * std::sqrt(harmonics) / fundamental,
            200.0 * std::abs(line(part, rate_hz, 2000.0)) / fundamental};
}

// AM-25 and AM-26: closed forms |1 + m cos| and max(0, 1 + m cos), computed in check-values.md.
// Half the last printed digit, and what the harmonics above 100 kHz put in wrong places at 200
// kS/s.
TEST(EnvelopeDetector, ShowsAFoldedCarrierAsItsClosedFormSays) {
    struct row {
        double m, mean, fundamental_over_mean, thd_percent, second_percent;
    };
    for (const row& truth :
         {row{1.1, 1.01818, 1.04530, 5.85, 3.17}, row{1.25, 1.06780, 1.04878, 14.93, 10.23},
          row{1.5, 1.17632, 0.99577, 28.38, 22.51}}) {
        envelope_detector d{{.rate_hz = 200000.0, .width_hz = 50000.0}};
        ASSERT_EQ(d.factor(), 1U);
        const auto in = baseband(10000, 200000.0, [&](double t) {
            return std::polar(0.5, 0.3) * (1.0 + truth.m * std::cos(turn * 1000.0 * t));
        });
        const waveform seen = waveform_of(detect(d, in), 200000.0, 90000.0);
        EXPECT_NEAR(seen.mean / 0.5, truth.mean, 6e-5); // aliases of the 200th harmonic: 5e-5
        EXPECT_NEAR(seen.fundamental_over_mean, truth.fundamental_over_mean, 1.1e-4);
        EXPECT_NEAR(seen.thd_percent, truth.thd_percent, 0.008);
        EXPECT_NEAR(seen.second_percent, truth.second_percent, 0.011);
    }
}

TEST(EnvelopeDetector, ShowsAPinchedCarrierAsItsClosedFormSays) {
    struct row {
        double m, mean, fundamental_over_mean, thd_percent;
    };
    for (const row& truth : {row{1.1, 1.00909, 1.07240, 2.88}, row{1.25, 1.03390, 1.14609, 7.06},
                             row{1.5, 1.08816, 1.22746, 12.44}}) {
        envelope_detector d{{.rate_hz = 200000.0, .width_hz = 50000.0}};
        const auto in = baseband(10000, 200000.0, [&](double t) {
            return cf64{std::max(0.0, 0.5 + 0.5 * truth.m * std::cos(turn * 1000.0 * t))};
        });
        const waveform seen = waveform_of(detect(d, in), 200000.0, 90000.0);
        EXPECT_NEAR(seen.mean / 0.5, truth.mean, 6e-5);
        EXPECT_NEAR(seen.fundamental_over_mean, truth.fundamental_over_mean, 1.1e-4);
        EXPECT_NEAR(seen.thd_percent, truth.thd_percent, 0.008);
    }
}

/// Fourier coefficient k of |1 + m cos x| over that of order 0, by the midpoint rule on 2^20
/// points.
double folded_coefficient(double m, int order) {
    double sum = 0.0, mean = 0.0;
    constexpr int points = 1 << 20;
    for (int i = 0; i < points; ++i) {
        const double x = turn * (i + 0.5) / points;
        const double value = std::abs(1.0 + m * std::cos(x));
        sum += 2.0 * value * std::cos(order * x);
        mean += value;
    }
    return sum / mean;
}

TEST(EnvelopeDetector, DoesNotAliasWhereSamplesAreFew) {
    // 24 kS/s for 20 kHz: the fold's harmonics above 12 kHz would land on those below.
    envelope_detector d{{.rate_hz = 24000.0, .width_hz = 20000.0}};
    EXPECT_EQ(d.factor(), 4U);
    const auto in = baseband(72000, 24000.0, [](double t) {
        return std::polar(0.5, -1.0) * (1.0 + 1.5 * std::cos(turn * 1000.0 * t));
    });
    const std::vector<float> audio = detect(d, in);
    ASSERT_EQ(audio.size(), in.size());
    const auto part = std::span{audio}.subspan(24000, 24000);
    const double mean = line(part, 24000.0, 0.0).real();
    double worst_plain = 0.0;
    for (int order = 1; order <= 10; ++order) {
        const double seen = 2.0 * line(part, 24000.0, 1000.0 * order).real() / mean;
        const double truth = folded_coefficient(1.5, order);
        EXPECT_NEAR(seen, truth, 3e-4) << order; // what is left aliases at 96 kS/s
        // The plain magnitude is the same series with order 24 k +- n folded onto n: it errs
        // visibly.
        worst_plain = std::max(worst_plain, std::abs(folded_coefficient(1.5, 24 - order)));
    }
    EXPECT_GT(worst_plain, 5e-3);
}

// DSP-20: mean and standard deviation of a Rician envelope; DSP-10: Rayleigh, mean 1.253314 sigma
// and standard deviation 0.655136 sigma (S. O. Rice 1944/45, from memory; values computed).
TEST(EnvelopeDetector, HasTheMeanAndSpreadOfARicianEnvelope) {
    struct row {
        double snr_db, mean_over_sigma, spread_over_sigma;
    };
    constexpr double none = -200.0;
    for (const row& truth :
         {row{none, 1.253314, 0.655136}, row{-10.0, 1.31521, 0.68573}, row{0.0, 1.81291, 0.84461},
          row{6.0, 3.00627, 0.96150}, row{20.0, 14.17754, 0.99874}}) {
        constexpr double sigma = 0.01;
        const double carrier = std::sqrt(2.0) * sigma * std::pow(10.0, truth.snr_db / 20.0);
        auto in = baseband(400000, 80000.0, [&](double) { return cf64{carrier}; });
        add_noise(in, 2.0 * sigma * sigma, 17);
        envelope_detector d{{.rate_hz = 80000.0, .width_hz = 20000.0}};
        double sum = 0.0, squares = 0.0;
        for (const float sample : detect(d, in)) {
            sum += static_cast<double>(sample);
            squares += static_cast<double>(sample) * static_cast<double>(sample);
        }
        const double mean = sum / 400000.0;
        const double spread = std::sqrt(squares / 400000.0 - mean * mean);
        const double scatter =
            1.0 / std::sqrt(400000.0); // of the mean, in sigmas; 4 of them allowed
        EXPECT_NEAR(mean / sigma, truth.mean_over_sigma, 4.0 * scatter);
        EXPECT_NEAR(spread / sigma, truth.spread_over_sigma, 4.0 * scatter);
    }
}

TEST(EnvelopeDetector, GivesTheSameBitsHoweverTheInputIsCut) {
    auto in = baseband(30000, 48000.0, [](double t) {
        return std::polar(0.3 + 0.2 * std::cos(turn * 700.0 * t), 9.0 * t);
    });
    add_noise(in, 1e-3, 4);
    envelope_detector d{{.rate_hz = 48000.0, .width_hz = 20000.0}};
    const std::vector<float> whole = detect(d, in);
    EXPECT_EQ(whole.size(), in.size());
    EXPECT_EQ(detect(d, in, 1), whole);
    EXPECT_EQ(detect(d, in, 2), whole);
}

TEST(EnvelopeDetector, RefusesAChannelThatTheRateDoesNotHold) {
    const auto refused =
        caught([] { envelope_detector d({.rate_hz = 8000.0, .width_hz = 9000.0}); });
    EXPECT_EQ(refused.kind, fault::bad_request);
    EXPECT_TRUE(refused.says("--width"));
}

// Outside: scipy's own envelope of the same samples (analytic signal by scipy.signal.hilbert of the
// real signal at 12 kHz), read at the beat of two carriers, the second 6 dB down.
TEST(OutsideEnvelope, AgreesWithScipyOnTwoCarriers) {
    if (run_command(TONEWALK_TEST_PYTHON " -c 'import scipy.signal'").status != 0) {
        ASSERT_EQ(std::getenv("CI"), nullptr) << "scipy is missing";
        GTEST_SKIP() << "scipy is missing";
    }
    const temporary_folder folder;
    const auto in = baseband(48000, 48000.0, [](double t) {
        return 0.4 + 0.4 * std::pow(10.0, -6.0 / 20.0) * std::polar(1.0, turn * 1000.0 * t);
    });
    {
        std::ofstream file{folder / "iq", std::ios::binary};
        file.write(reinterpret_cast<const char*>(in.data()),
                   static_cast<std::streamsize>(in.size() * sizeof(cf32)));
    }
    write_file(folder / "envelope.py", R"(
import sys, numpy as np, scipy.signal
z = np.fromfile(sys.argv[1], np.complex64)
t = np.arange(len(z)) / 48000
real = (z * np.exp(2j * np.pi * 12000 * t)).real
e = np.abs(scipy.signal.hilbert(real))
for order in range(4):
    print((2 if order else 1) * abs(np.mean(e * np.exp(-2j * np.pi * 1000 * order * t))))
)");
    const auto answer =
        run_command(fmt::format("{} {} {}", TONEWALK_TEST_PYTHON, (folder / "envelope.py").string(),
                                (folder / "iq").string()));
    ASSERT_EQ(answer.status, 0) << answer.output;
    std::istringstream lines{answer.output};
    envelope_detector d{{.rate_hz = 48000.0, .width_hz = 12000.0}};
    const std::vector<float> audio = detect(d, in);
    for (int order = 0; order < 4; ++order) {
        double truth = 0.0;
        ASSERT_TRUE(lines >> truth);
        const double seen =
            (order == 0 ? 1.0 : 2.0) * std::abs(line(audio, 48000.0, 1000.0 * order));
        EXPECT_NEAR(db(seen / truth), 0.0, 0.05) << order;
    }
}

} // namespace
} // namespace tonewalk
