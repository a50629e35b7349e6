// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/meter/gain_control.hpp"

#include <cmath>
#include <functional>
#include <numbers>
#include <string>
#include <variant>

#include <gtest/gtest.h>

#include "tonewalk/base/random.hpp"

namespace tonewalk {
namespace {

using time_db = std::function<double(double)>;

double none(double) {
    return 0.0;
}

/// Levels as a receiver of this gain logs a field and a steady noise 50 dB below its peak, whose
/// readings scatter by 0.3 dB.
level_log logged(const time_db& field_db, const time_db& gain_db, double seconds = 40.0) {
    level_log log;
    log.every_s = log.window_s = 0.2; // neighbours are independent
    random_stream random{5};
    for (double t = 0.1; t < seconds; t += log.every_s) {
        level_record r;
        r.time_s = t;
        r.carrier_dbfs.value = -10.0 + field_db(t) + gain_db(t);
        r.noise_power = std::pow(10.0, (-60.0 + gain_db(t) + 0.3 * random.gaussian()) / 10.0);
        r.carrier = {std::pow(10.0, r.carrier_dbfs.value / 10.0), std::sqrt(r.noise_power / 2.0),
                     true};
        log.records.push_back(r);
    }
    return log;
}

/// 20 dB deep, one each 10 s.
double fade(double t) {
    return -10.0 * (1.0 - std::cos(2.0 * std::numbers::pi * t / 10.0));
}

TEST(GainControlResult, OfASteadyGainIsNoSuspicion) {
    const gain_control_result r = judge_gain_control(logged(fade, none));
    EXPECT_TRUE(r.judged);
    EXPECT_FALSE(r.suspected);
    EXPECT_NEAR(r.carrier_range_db, 20.0, 0.5);
    EXPECT_NEAR(r.noise_rise_db, 0.0, 0.2);
    EXPECT_TRUE(std::isnan(r.step_db));
    EXPECT_TRUE(r.doubts.all().empty());
}

TEST(GainControlResult, SaysByHowMuchTheNoiseRises) {
    const auto follows = [](double t) { return -0.1 * fade(t); }; // 2 dB over the fade
    const auto stops = [](double t) { return fade(t) > -6.0 ? -2.0 : 0.0; };
    for (const time_db& gain : {time_db{follows}, time_db{stops}}) {
        const gain_control_result r = judge_gain_control(logged(fade, gain));
        EXPECT_TRUE(r.suspected);
        EXPECT_NEAR(r.noise_rise_db, 2.0, 0.4);
        EXPECT_TRUE(r.doubts.has(note_code::agc_suspected));
        EXPECT_FALSE(r.doubts.has(note_code::gain_step));
    }
}

TEST(GainControlResult, SaysWhenAndByHowMuchTheGainStepsUnderAFade) {
    const auto step = [](double t) { return t < 21.0 ? 0.0 : -3.0; };
    const gain_control_result r = judge_gain_control(logged(fade, step));
    EXPECT_FALSE(r.suspected);
    EXPECT_NEAR(r.step_db, -3.0, 0.2);
    EXPECT_NEAR(r.step_s, 21.0, 0.4);
    EXPECT_TRUE(r.doubts.has(note_code::gain_step));
    EXPECT_EQ(r.doubts.all().size(), 1U);
}

TEST(GainControlResult, IsNotJudgedWhereTheCarrierStandsStill) {
    const auto still = [](double t) { return 0.1 * fade(t); };
    const gain_control_result r = judge_gain_control(logged(still, none));
    EXPECT_FALSE(r.judged);
    EXPECT_NE(r.evidence.find("only"), std::string::npos) << r.evidence;
    EXPECT_FALSE(judge_gain_control(logged(fade, none, 5.0)).judged); // 25 records
    EXPECT_FALSE(judge_gain_control(level_log{}).judged);
}

TEST(GainControlResult, IsNotJudgedWhereCompressionMovesTheNoise) {
    const auto squeezed = [](double t) { return -0.1 * (20.0 + fade(t)); };
    EXPECT_TRUE(judge_gain_control(logged(fade, squeezed)).suspected);
    const gain_control_result r = judge_gain_control(logged(fade, squeezed), true);
    EXPECT_FALSE(r.judged);
    EXPECT_TRUE(r.doubts.all().empty());
}

// A step that lies between records far apart may be the field's: nobody saw it happen.
TEST(GainStepsOfALog, AreNoneAcrossMissingRecords) {
    const auto step = [](double t) { return t < 20.0 ? 0.0 : 3.0; };
    level_log log = logged(none, step);
    EXPECT_TRUE(judge_gain_control(log).doubts.has(note_code::gain_step));
    for (level_record& r : log.records) {
        if (std::abs(r.time_s - 20.0) < 1.0) {
            r.carrier_dbfs.value = not_measured;
        }
    }
    EXPECT_FALSE(judge_gain_control(log).doubts.has(note_code::gain_step));
}

TEST(GainControlResult, ThatHoldsTheCarrierStillShowsInTheNoise) {
    const auto levels_out = [](double t) { return -0.95 * fade(t); }; // 1 dB of 20 are left
    const gain_control_result r = judge_gain_control(logged(fade, levels_out));
    EXPECT_TRUE(r.suspected);
    EXPECT_TRUE(r.doubts.has(note_code::agc_suspected));
    EXPECT_NEAR(r.noise_rise_db, 19.0, 1.0);
    const auto hardly = [](double t) { return -0.1 * fade(t); }; // 2 dB of noise, a steady field
    EXPECT_FALSE(
        judge_gain_control(logged([&](double t) { return -hardly(t); }, hardly)).suspected);
}

TEST(GainControlResult, SheetIsNullWhereNothingWasJudged) {
    const sheet unknown = describe(gain_control_result{});
    EXPECT_TRUE(std::holds_alternative<std::monostate>(*unknown.find("suspected")));
    const sheet known = describe(judge_gain_control(logged(fade, none)));
    EXPECT_FALSE(std::get<bool>(*known.find("suspected")));
    EXPECT_FALSE(std::get<std::string>(*known.find("evidence")).empty());
}

} // namespace
} // namespace tonewalk
