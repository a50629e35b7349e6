// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/meter/envelope_suppression.hpp"

#include <cmath>

#include <gtest/gtest.h>

#include "support/am_source.hpp"
#include "tonewalk/meter/level_notes.hpp"

namespace tonewalk {
namespace {

// DSP-21: A r'(A) / r(A) with the Rician mean, computed by numerical
// integration; five decimals.
TEST(EnvelopeSuppression, EqualsTheTableOfRicianMeans) {
    constexpr double half_last_digit = 0.000005;
    constexpr struct {
        double carrier_to_noise_db, factor;
    } table[] = {{-3, 0.36041}, {0, 0.55407},  {3, 0.74255},  {6, 0.87101}, {10, 0.94983},
                 {12, 0.96842}, {15, 0.98418}, {20, 0.99500}, {30, 0.99950}};
    for (const auto& row : table) {
        EXPECT_NEAR(envelope_depth_factor(std::pow(10.0, row.carrier_to_noise_db / 10.0)),
                    row.factor, half_last_digit)
            << row.carrier_to_noise_db << " dB";
    }
}

TEST(EnvelopeSuppression, IsSmoothWhereItsAsymptoteBeginsAndEndsAtZeroAndOne) {
    EXPECT_NEAR(envelope_depth_factor(99.999), envelope_depth_factor(100.001), 1e-6);
    EXPECT_EQ(envelope_depth_factor(0.0), 0.0);
    EXPECT_NEAR(envelope_depth_factor(1e-6), 1e-6, 1e-9);
    EXPECT_NEAR(envelope_depth_factor(1e9), 1.0, 1e-8);
}

level_log with_carrier_to_noise(double db, bool envelope_in_use) {
    test::am_signal s;
    s.rate_hz = 12e3;
    const test::meter_options o{.envelope_in_use = envelope_in_use};
    const double bandwidth_hz = test::meter_config(s, o).noise_bandwidth_hz;
    s.noise_density = std::pow(10.0, (s.carrier_dbfs - db) / 10.0) / bandwidth_hz;
    level_log log = test::measure(s, 5.0, o);
    add_level_notes(log, quantity::tone);
    return log;
}

// 0.1 dB low is a factor of 0.98855, which stands between the table's 15 and 20
// dB.
TEST(EnvelopeSuppression, IsNotedFromATenthOfADecibelOnAndOnlyWhereAnEnvelopeIsRead) {
    const level_log low = with_carrier_to_noise(15.0, true);
    EXPECT_TRUE(low.doubts.has(note_code::envelope_suppressed));
    for (const level_record& r : low.records) {
        EXPECT_TRUE(r.flags & flag_envelope_suppressed);
    }
    EXPECT_FALSE(with_carrier_to_noise(19.0, true).doubts.has(note_code::envelope_suppressed));
    EXPECT_FALSE(with_carrier_to_noise(15.0, false).doubts.has(note_code::envelope_suppressed));
}

} // namespace
} // namespace tonewalk
