// SPDX-License-Identifier: GPL-3.0-or-later
// The receiver's image taken out before anything is measured.
#include <cmath>
#include <numbers>

#include <gtest/gtest.h>

#include "channel_support.hpp"
#include "scene_search.hpp"
#include "support/expect_error.hpp"
#include "tonewalk/maths/window.hpp"

namespace tonewalk {
namespace {

using test::caught;
using test::modulated;
using test::pure;
using test::quiet_scene;
using test::search;
using test::source_of;

/// k = 0.0316, 30 dB below the signal.
scene with_image(scene s) {
    s.receiver.iq_gain_error_db = 0.45;
    s.receiver.iq_phase_error_deg = 2.0;
    return s;
}

std::vector<cf32> baseband(const scene& s, const channel_plan& plan, double& rate_hz,
                           const std::optional<iq_balance>& mend) {
    const test::memory_source source = source_of(s);
    test::channel_run run{source.facts(), render_bytes(s), plan, 16, mend};
    rate_hz = run.chain.rate_hz();
    const auto middle = test::settled(run);
    return {middle.begin(), middle.end()};
}

cf64 line(std::span<const cf32> iq, double hz, double rate_hz) {
    const window shape = hann_window(iq.size());
    cf64 sum{};
    for (std::size_t n = 0; n < iq.size(); ++n) {
        const double turns = std::fmod(hz / rate_hz * static_cast<double>(n), 1.0);
        sum += cf64{iq[n]} * std::polar(2.0 * shape.values()[n], -test::two_pi * turns);
    }
    return sum / static_cast<double>(iq.size());
}

/// Largest error of the tone's level over windows of 0.2 s, from both its lines in power, dB.
double worst_tone_error_db(const scene& s, const found_signal& f) {
    double rate_hz = 0.0, worst_db = 0.0;
    const std::vector<cf32> iq = baseband(s, f.plan, rate_hz, f.mended);
    const scene_tone& tone = s.carriers.front().tones.front();
    const double truth =
        std::pow(10.0, s.carriers.front().level_dbfs / 20.0) * tone.depth_percent / 100.0;
    const double off_hz = s.carriers.front().offset_hz - f.plan.carrier_hz;
    const auto size = static_cast<std::size_t>(0.2 * rate_hz);
    for (std::size_t first = 0; first + size <= iq.size(); first += size) {
        const auto part = std::span{iq}.subspan(first, size);
        const double power = 2.0 * (std::norm(line(part, off_hz + tone.frequency_hz, rate_hz)) +
                                    std::norm(line(part, off_hz - tone.frequency_hz, rate_hz)));
        worst_db = std::max(worst_db, std::abs(10.0 * std::log10(power / (truth * truth))));
    }
    return worst_db;
}

// The carrier's image stands 6 Hz beside the lower sideband, half as strong as that one's fifth.
TEST(Mending, LevelsThatTheImageMakesWrongReadRight) {
    for (const double offset_hz : {497.0, -502.5, 503.0}) {
        const scene s = with_image(quiet_scene({modulated(offset_hz)}));
        const found_signal as_it_is = search(s);
        const found_signal mended = search(s, {.mend_iq = true});
        EXPECT_GT(worst_tone_error_db(s, as_it_is), 0.3) << offset_hz;
        EXPECT_LT(worst_tone_error_db(s, mended), 0.002) << offset_hz;
    }
}

TEST(Mending, TheImageFallsBelow80DecibelsUnderTheCarrier) {
    const scene s = with_image(quiet_scene({modulated(1700.0)}));
    const found_signal mended = search(s, {.mend_iq = true});
    ASSERT_TRUE(mended.mended.has_value());
    const channel_plan wide{1700.0, false, 9000.0};
    const auto image_dbc = [&](const std::optional<iq_balance>& mend) {
        double rate_hz = 0.0;
        const std::vector<cf32> iq = baseband(s, wide, rate_hz, mend);
        return 20.0 *
               std::log10(std::abs(line(iq, -3400.0, rate_hz)) / std::abs(line(iq, 0.0, rate_hz)));
    };
    EXPECT_NEAR(image_dbc({}), -30.0, 0.3);
    EXPECT_LT(image_dbc(mended.mended), -80.0);
}

TEST(Mending, SaysWhatWasTakenOutAndBoundsWhatMayBeLeft) {
    const scene s = with_image(quiet_scene({modulated(900.0)}));
    const found_signal as_it_is = search(s), mended = search(s, {.mend_iq = true});
    EXPECT_FALSE(as_it_is.mended.has_value());
    EXPECT_NEAR(20.0 * std::log10(as_it_is.image_ratio), -30.0, 0.3);
    ASSERT_TRUE(mended.mended.has_value());
    EXPECT_NEAR(mended.mended->gain_error_db, 0.45, 0.01);
    EXPECT_NEAR(mended.mended->phase_error_deg, 2.0, 0.05);
    EXPECT_GE(mended.image_ratio, 0.9 * mended.mended->image_ratio_u95);
    EXPECT_LE(mended.image_ratio, 3.0 * mended.mended->image_ratio_u95);
    EXPECT_LT(mended.image_ratio, 1e-4);
}

TEST(Mending, IsFittedWhereALateCarrierWasFound) {
    scene_carrier c = modulated(1700.0);
    c.start_s = 8.0;
    scene s = with_image(quiet_scene({c}));
    s.duration_s = 16.0;
    const found_signal f = search(s, {.mend_iq = true});
    EXPECT_TRUE(f.notes.has(note_code::late_carrier));
    ASSERT_TRUE(f.mended.has_value());
    EXPECT_NEAR(f.mended->gain_error_db, 0.45, 0.01);
}

TEST(Mending, IsRefusedWhereNothingShowsTheImage) {
    const auto refusal = [](const scene& s, std::optional<signed_hz> carrier = {}) {
        const auto failure = caught([&] { search(s, {.carrier = carrier, .mend_iq = true}); });
        EXPECT_TRUE(failure.says("--mend-iq"));
        EXPECT_TRUE(failure.says("leave it out"));
        return failure.exit_status;
    };
    scene real = quiet_scene({modulated(7312.34)});
    real.format = parse_sample_format("ri16_le").value();
    EXPECT_EQ(refusal(real), 3);
    EXPECT_EQ(refusal(quiet_scene({pure(1.0)}), signed_hz{1.0, true}), 3); // on the centre itself
    const scene with_twin = quiet_scene({pure(7312.34), pure(-7311.34, -40.0)});
    EXPECT_EQ(refusal(with_twin), 3);
}

} // namespace
} // namespace tonewalk
