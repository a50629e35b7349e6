// SPDX-License-Identifier: GPL-3.0-or-later
#include <cmath>

#include <gtest/gtest.h>

#include "channel/scene_search.hpp"
#include "tonewalk/base/random.hpp"
#include "tonewalk/channel/signal_search.hpp"

namespace tonewalk::test {
namespace {

void expect_found(const found_signal& f, double offset_hz, double tone_hz, double tolerance_hz) {
    EXPECT_NEAR(f.offset_hz, offset_hz, tolerance_hz);
    ASSERT_TRUE(f.tone_hz) << "no tone at " << offset_hz;
    EXPECT_NEAR(*f.tone_hz, tone_hz, tolerance_hz);
    EXPECT_EQ(f.carriers.size(), 1U);
}

} // namespace

TEST(SignalFormats, SignalsAreFoundInEveryStoredFormat) {
    for (const char* format : {"ci8", "cu8", "ci16_be", "cu16_le", "ci32_le", "cf64_le"}) {
        SCOPED_TRACE(format);
        scene s = quiet_scene({modulated(7012.3, -14.0)});
        s.format = parse_sample_format(format).value();
        s.receiver.noise_lsb_rms = s.format.is_float() ? 0.0 : 0.5;
        expect_found(search(s), 7012.3, 1000.0, 0.05);
    }
}

TEST(SignalFormats, RealRecordingsHoldTheirSignalAtItsPositiveFrequency) {
    for (const char* format : {"rf32_le", "ri16_le", "ru8"}) {
        SCOPED_TRACE(format);
        scene s = quiet_scene({modulated(12003.7, -20.0, 997.0)});
        s.format = parse_sample_format(format).value();
        s.receiver.noise_lsb_rms = s.format.is_float() ? 0.0 : 0.5;
        const found_signal f = search(s);
        expect_found(f, 12003.7, 997.0, 0.05);
        EXPECT_NEAR(f.carriers.at(0).level_dbfs, -20.0, 0.1);
    }
}

TEST(SignalFormats, ALaneOrAMirroredOrExchangedSpectrumIsSearchedAsItIsMeasured) {
    scene s = quiet_scene({modulated(7012.3)});
    memory_source plain = source_of(s);
    const auto seen = [&](bool swap_iq, bool inverted) {
        stream_facts facts = plain.facts();
        facts.swap_iq = swap_iq;
        facts.inverted = inverted;
        memory_source source{facts, render_bytes(s)};
        return find_signal(source, {}).offset_hz;
    };
    EXPECT_NEAR(seen(false, false), 7012.3, 0.05);
    EXPECT_NEAR(seen(true, false), -7012.3, 0.05);
    EXPECT_NEAR(seen(false, true), -7012.3, 0.05);
    EXPECT_NEAR(seen(true, true), 7012.3, 0.05);

    stream_facts two = plain.facts();
    two.lanes = 2;
    two.lane = 1;
    const auto own = render_bytes(s), other = render_bytes(quiet_scene({modulated(-3000.0)}));
    const std::size_t sample = s.format.sample_bytes();
    std::vector<std::byte> frames;
    for (std::size_t at = 0; at < own.size(); at += sample) {
        frames.insert(frames.end(), other.begin() + static_cast<std::ptrdiff_t>(at),
                      other.begin() + static_cast<std::ptrdiff_t>(at + sample));
        frames.insert(frames.end(), own.begin() + static_cast<std::ptrdiff_t>(at),
                      own.begin() + static_cast<std::ptrdiff_t>(at + sample));
    }
    memory_source source{two, frames};
    EXPECT_NEAR(find_signal(source, {}).offset_hz, 7012.3, 0.05);
}

// None on round numbers; three places in the band, one 5 % from its edge, on both sides.
TEST(SignalFormats, SignalsAreFoundAnywhereInTheBandAtAnyRate) {
    random_stream random{42};
    for (const double rate_hz : {11.025e3, 31.77e3, 96.3e3, 250.7e3, 1.0237e6}) {
        for (const double place : {-0.45, -0.23, 0.13, 0.45}) {
            const double offset_hz = (place + random.uniform(-0.004, 0.004)) * rate_hz;
            const double tone_hz = random.uniform(100.0, 450.0);
            scene s = quiet_scene({modulated(offset_hz, -30.0, tone_hz, 40.0)});
            s.rate_hz = rate_hz;
            s.duration_s = 0.7;
            SCOPED_TRACE(offset_hz);
            expect_found(search(s), offset_hz, tone_hz, 0.05);
        }
    }
}

TEST(SignalFormats, AWideRecordingIsSearchedToo) {
    scene s = quiet_scene({modulated(3.2003e6, -20.0, 1000.7)});
    s.format = parse_sample_format("ci16_le").value();
    s.rate_hz = 20e6;
    s.duration_s = 0.1;
    expect_found(search(s), 3.2003e6, 1000.7, 1.0);
}

TEST(SignalFormats, ATwentiethOfASecondIsEnoughForAClearSignal) {
    scene s = quiet_scene({modulated(1234.0, -20.0, 400.0, 80.0)});
    s.rate_hz = 8e3;
    for (const double duration_s : {0.05, 0.1, 0.3}) {
        s.duration_s = duration_s;
        SCOPED_TRACE(duration_s);
        const found_signal f = search(s);
        expect_found(f, 1234.0, 400.0, 0.1 / duration_s);
        EXPECT_TRUE(f.notes.has(note_code::short_opening));
    }
}

TEST(SignalFormats, NonFiniteSamplesDoNotHideTheSignal) {
    scene s = quiet_scene({modulated(7000.0)});
    s.receiver.non_finite.push_back({.first = 30000, .count = 20});
    expect_found(search(s), 7000.0, 1000.0, 0.1);
}

TEST(SignalFormats, MovingWavesDoNotHideTheSignal) {
    scene_carrier c = modulated(7000.0);
    c.waves = {{.amplitude = 1.0}, {.amplitude = 0.9, .direction_deg = 180.0}};
    scene s = quiet_scene({c});
    s.centre_hz = 145e6;
    s.path.speed_m_s = 1.0; // a Doppler shift of half a hertz either way
    expect_found(search(s), 7000.0, 1000.0, 1.0);
}

TEST(SignalFormats, AnUnsteadyOscillatorDoesNotHideTheSignal) {
    for (const double wobble_hz : {1.0, 5.0, 15.0}) {
        for (const double period_s : {0.3, 1.0, 4.0}) {
            SCOPED_TRACE(std::to_string(wobble_hz) + " Hz in " + std::to_string(period_s) + " s");
            scene_carrier c = modulated(7000.0, -20.0, 1000.0, 40.0);
            c.wobble_hz = wobble_hz;
            c.wobble_period_s = period_s;
            const found_signal f = search(quiet_scene({c}));
            EXPECT_NEAR(f.offset_hz, 7000.0, wobble_hz + 1.0);
            ASSERT_TRUE(f.tone_hz);
            EXPECT_NEAR(*f.tone_hz, 1000.0, 0.5);
        }
    }
    scene_carrier drifting = modulated(7000.0);
    drifting.drift_hz_s = 3.0;
    expect_found(search(quiet_scene({drifting})), 7003.0, 1000.0, 3.5);
}

} // namespace tonewalk::test
