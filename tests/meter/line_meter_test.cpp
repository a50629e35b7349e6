// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/meter/line_meter.hpp"

#include <cmath>
#include <numbers>

#include <gtest/gtest.h>

#include "support/am_source.hpp"
#include "tonewalk/base/allowed_errors.hpp"

namespace tonewalk {
namespace {

using test::am_signal;
using test::measure;

// Nothing on round numbers: each case draws rate, offset, tone, phases and depth from its seed.
TEST(CleanLevels, HoldInEveryRecordFromZeroToMinusNinety) {
    for (std::uint64_t seed = 1; seed <= 12; ++seed) {
        random_stream random{seed};
        am_signal s;
        s.rate_hz = random.uniform(20e3, 40e3);
        s.offset_hz = random.uniform(-0.4, 0.4);
        s.tone_hz = random.uniform(300.0, 2500.0);
        s.depth = random.uniform(0.05, 0.95);
        s.carrier_dbfs = -90.0 * random.uniform() - 20.0 * std::log10(1.0 + s.depth);
        s.phase = random.uniform(0.0, 6.28);
        s.tone_phase = random.uniform(0.0, 6.28);
        const level_log log = measure(s, 6.0, {});
        ASSERT_GT(log.records.size(), 50U);
        const double tone_dbfs = s.carrier_dbfs + 20.0 * std::log10(s.depth);
        for (const level_record& r : log.records) {
            EXPECT_NEAR(r.carrier_dbfs.value, s.carrier_dbfs, allowed("level_db.clean")) << seed;
            EXPECT_NEAR(r.tone_dbfs.value, tone_dbfs, allowed("level_db.clean")) << seed;
        }
        EXPECT_NEAR(log.tone_hz, s.tone_hz, 1e-4);
        EXPECT_NEAR(log.carrier_offset_hz, s.offset_hz, 1e-4);
    }
}

} // namespace
} // namespace tonewalk
