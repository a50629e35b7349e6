// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/channel/plan.hpp"

#include <gtest/gtest.h>

#include "support/memory_source.hpp"

namespace tonewalk::test {
namespace {

std::optional<double> offset(const channel_plan& plan, std::string_view format,
                             std::optional<double> centre_hz = std::nullopt) {
    stream_facts facts = facts_of(format, 1e6, 1000);
    facts.stretches.front().centre_hz = centre_hz;
    return offset_in(plan, facts, facts.stretches.front());
}

TEST(ChannelPlan, AbsoluteCarrierIsCountedFromTheStretchsCentre) {
    EXPECT_EQ(offset({145.2e6, true, 20e3}, "ci16_le", 145e6), 200e3);
    EXPECT_EQ(offset({144.9e6, true, 20e3}, "ci16_le", 145e6), -100e3);
    EXPECT_EQ(offset({145.2e6, true, 20e3}, "ci16_le"), std::nullopt); // no centre known
}

TEST(ChannelPlan, ComplexBandHoldsWhatLiesWithinHalfTheRate) {
    EXPECT_EQ(offset({490e3, false, 20e3}, "cf32_le"), 490e3);
    EXPECT_EQ(offset({-490e3, false, 20e3}, "cf32_le"), -490e3);
    EXPECT_EQ(offset({490.001e3, false, 20e3}, "cf32_le"), std::nullopt);
    EXPECT_EQ(offset({-490.001e3, false, 20e3}, "cf32_le"), std::nullopt);
    EXPECT_EQ(offset({0.0, false, 1e6}, "cf32_le"), 0.0);
}

TEST(ChannelPlan, RealBandBeginsAtZero) {
    EXPECT_EQ(offset({10e3, false, 20e3}, "ri16_le"), 10e3);
    EXPECT_EQ(offset({9.999e3, false, 20e3}, "ri16_le"), std::nullopt);
    EXPECT_EQ(offset({-100e3, false, 20e3}, "ri16_le"), std::nullopt);
    EXPECT_EQ(offset({490e3, false, 20e3}, "ri16_le"), 490e3);
}

TEST(ChannelPlan, WidthMadeToFitTheBandFits) {
    for (const double carrier_hz : {333333.3, 123456.789, -417171.7, 0.1}) {
        const double width_hz = 2.0 * (0.5e6 - std::abs(carrier_hz));
        EXPECT_EQ(offset({carrier_hz, false, width_hz}, "cf32_le"), carrier_hz);
    }
}

} // namespace
} // namespace tonewalk::test
