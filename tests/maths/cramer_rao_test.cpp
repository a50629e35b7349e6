// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/maths/cramer_rao.hpp"

#include <numbers>

#include <gtest/gtest.h>

namespace tonewalk {

// DSP-3: spots of the bound of Rife & Boorstyn 1974 for a complex tone, computed apart.
TEST(CramerRao, ComplexToneHasTheKnownSpots) {
    const tone_bound short_record = complex_tone_bound(100.0, 1000, 48e3);
    EXPECT_NEAR(short_record.frequency_hz, 0.059175, 5e-7);
    EXPECT_NEAR(100.0 * short_record.relative_amplitude, 0.2236, 5e-5);
    EXPECT_NEAR(short_record.middle_phase_rad * 180.0 / std::numbers::pi, 0.1281, 5e-5);
    EXPECT_NEAR(complex_tone_bound(10.0, 48000, 48e3).frequency_hz, 5.627e-4, 5e-8);
    EXPECT_NEAR(complex_tone_bound(10.0, 100000, 1e6).frequency_hz, 3.898e-3, 5e-7);
}

// DSP-1: var of the first sample's phase 2 s^2 (2N - 1) / (b^2 N (N + 1)), s = 1, b^2 = 20.
TEST(CramerRao, TheFirstPhaseIsFourTimesHarderThanTheMiddleOne) {
    const tone_bound bound = complex_tone_bound(10.0, 50, 1.0);
    EXPECT_NEAR(bound.first_phase_rad * bound.first_phase_rad, 2.0 * 99.0 / (20.0 * 50.0 * 51.0),
                1e-15);
    EXPECT_NEAR(bound.middle_phase_rad * bound.middle_phase_rad, 1.0 / (20.0 * 50.0), 1e-15);
}

// DSP-4: a real tone (S. M. Kay, Fundamentals of Statistical Signal Processing: Estimation Theory,
// from memory; spot computed apart).
TEST(CramerRao, RealToneHasTheKnownSpot) {
    const tone_bound bound = real_tone_bound(100.0, 4800, 48e3);
    EXPECT_NEAR(bound.frequency_hz, 7.958e-3, 5e-7);
    EXPECT_NEAR(100.0 * bound.relative_amplitude, 0.1443, 5e-5);
}

} // namespace tonewalk
