// SPDX-License-Identifier: GPL-3.0-or-later
// What the search says of the receiver's own lines, dc-in-channel and image-in-channel.
#include <cmath>
#include <numbers>

#include <gtest/gtest.h>

#include "scene_search.hpp"
#include "support/expect_error.hpp"
#include "tonewalk/base/random.hpp"

namespace tonewalk {
namespace {

using test::caught;
using test::has;
using test::modulated;
using test::pure;
using test::quiet_scene;
using test::search;
using test::text_of;

/// Errors of gain and phase that make an image of this ratio: e^(-j e) gQ/gI = (1 - k)/(1 + k).
void add_image(scene& s, cf64 k) {
    const cf64 q_over_i = (1.0 - k) / (1.0 + k);
    s.receiver.iq_gain_error_db = -20.0 * std::log10(std::abs(q_over_i));
    s.receiver.iq_phase_error_deg = -std::arg(q_over_i) * 180.0 / std::numbers::pi;
}

// What is no line of the receiver's

TEST(ReceiverNotes, ASidebandAtTheCentreIsNoDirectCurrent) {
    for (const double off_hz : {0.0, 0.01, 0.3, -2.0}) {
        const scene s = quiet_scene({modulated(1000.0 + off_hz)});
        EXPECT_FALSE(has(search(s), note_code::dc_in_channel)) << off_hz;
        EXPECT_EQ(search(s).dc_amplitude, 0.0) << off_hz;
    }
}

TEST(ReceiverNotes, ASidebandInTheMirrorPlaceIsNoImage) {
    for (const double off_hz : {0.0, 0.01, 0.3, 2.0, -7.0}) {
        const found_signal f = search(quiet_scene({modulated(500.0 + off_hz)}));
        EXPECT_FALSE(has(f, note_code::image_in_channel)) << off_hz;
        EXPECT_LT(f.image_ratio, 1e-3) << off_hz;
    }
}

TEST(ReceiverNotes, AnotherCarrierInTheMirrorPlaceIsNoImage) {
    for (const double off_hz : {0.4, 1.7, 12.0}) {
        const found_signal f = search(quiet_scene({pure(900.0), pure(-900.0 + off_hz, -45.0)}));
        EXPECT_FALSE(has(f, note_code::image_in_channel)) << off_hz;
    }
}

// What to do next time

TEST(ReceiverNotes, NameTheFrequencyToTuneTo) {
    scene s = quiet_scene({modulated(2500.0)});
    s.rate_hz = 96e3;
    s.receiver.dc_dbfs = -60.0;
    // 6 kHz wide: 10 kHz is the first of 1, 2, 5, 10 ... beyond 1.5 widths.
    EXPECT_NE(text_of(search(s), note_code::dc_in_channel)
                  .find("tune the receiver so that the carrier lies at +10 kHz or more"),
              std::string::npos);
    s.centre_hz = 145.2e6; // 145.2025 MHz less 10 kHz, down to whole kilohertz
    const std::string advice = text_of(search(s), note_code::dc_in_channel);
    EXPECT_NE(advice.find("to 145.192 MHz so that the carrier lies at +10 kHz or more"),
              std::string::npos)
        << advice;
    EXPECT_EQ(advice.find("bandwidth"), std::string::npos) << advice;
    s.centre_hz = 145.192e6; // as advised
    s.carriers.front().offset_hz = 10'500.0;
    EXPECT_FALSE(has(search(s), note_code::dc_in_channel));
}

TEST(ReceiverNotes, AskForMoreBandwidthWhereTheBandIsTooNarrow) {
    scene s = quiet_scene({modulated(2500.0)});
    s.rate_hz = 24e3;
    s.receiver.dc_dbfs = -60.0;
    // 10 kHz off the centre and 6 kHz more on either side: 32 kHz.
    EXPECT_NE(text_of(search(s), note_code::dc_in_channel).find("record 50 kHz or more"),
              std::string::npos);
}

TEST(ReceiverNotes, NameTheOptionThatTakesTheImageOut) {
    scene s = quiet_scene({modulated(900.0)});
    add_image(s, {0.02, 0.01});
    EXPECT_NE(text_of(search(s), note_code::image_in_channel).find("--mend-iq"), std::string::npos);
    EXPECT_FALSE(has(search(s, {.mend_iq = true}), note_code::image_in_channel));
}

// How often they are wrong

/// A walk through a standing wave, or a fade drawn by hand, of one carrier with a tone or speech,
/// strong or weak; its offset is at most `reach` widths of its channel.
scene random_fading_scene(random_stream& draw, double reach, double least_dbhz) {
    scene s;
    const double rates_hz[] = {8e3, 16e3, 48e3};
    s.rate_hz = rates_hz[static_cast<int>(draw.uniform(0.0, 3.0))];
    s.format = parse_sample_format(draw.uniform() < 0.5 ? "cf32_le" : "ci16_le").value();
    s.duration_s = draw.uniform(0.6, 3.0);
    s.centre_hz = 145e6;
    s.seed = static_cast<std::uint64_t>(draw.uniform(1.0, 1e9));
    const double tone_hz = std::exp(draw.uniform(std::log(100.0), std::log(s.rate_hz / 16.0)));
    const double width_hz = std::max(2000.0, 6.0 * tone_hz);
    const double room_hz = s.rate_hz / 2.0 - 1.1 * width_hz / 2.0;
    const double offset_hz = draw.uniform(-1.0, 1.0) * std::min(room_hz, reach * width_hz);
    scene_carrier c =
        modulated(offset_hz, draw.uniform(-50.0, -10.0), tone_hz, draw.uniform(10.0, 95.0));
    if (s.rate_hz > 20e3 && draw.uniform() < 0.2) {
        c.tones.clear();
        c.speech_percent = 80.0;
    }
    const double depth_db = draw.uniform() < 0.5 ? 20.0 : 60.0;
    if (draw.uniform() < 0.5) {
        const double swr = std::pow(10.0, depth_db / 20.0);
        c.waves = {{.amplitude = 1.0, .direction_deg = 0.0},
                   {.amplitude = (swr - 1.0) / (swr + 1.0),
                    .phase_deg = draw.uniform(0.0, 360.0),
                    .direction_deg = 180.0}};
        s.path.speed_m_s = std::exp(draw.uniform(std::log(0.3), std::log(20.0)));
    } else {
        const double middle_s = draw.uniform(0.0, 2.0), flank_s = draw.uniform(0.1, 1.0);
        c.fades = {{middle_s - flank_s, 0.0}, {middle_s, -depth_db}, {middle_s + flank_s, 0.0}};
    }
    s.receiver.noise_dbfs_hz = c.level_dbfs - draw.uniform(least_dbhz, 100.0);
    s.carriers = {c};
    return s;
}

struct tally {
    int direct_current = 0, image = 0, searched = 0;
};

/// Notes raised in 100 scenes, each changed by `change`. Where no carrier is found none is raised.
template <class Change>
tally notes_in_random_scenes(double reach, double least_dbhz, Change change) {
    random_stream draw{20270118}; // none of those that thresholds were set with
    tally t;
    for (int k = 0; k < 100; ++k) {
        scene s = random_fading_scene(draw, reach, least_dbhz);
        change(s, draw);
        const auto count_notes = [&] {
            const found_signal f = search(s);
            ++t.searched;
            t.direct_current += has(f, note_code::dc_in_channel) ? 1 : 0;
            t.image += has(f, note_code::image_in_channel) ? 1 : 0;
        };
        const auto failure = caught(count_notes);
        EXPECT_TRUE(!failure.kind || failure.exit_status == 3) << k;
    }
    EXPECT_GE(t.searched, 95);
    return t;
}

TEST(CoverageReceiverNotes, CleanFadesRaiseNone) {
    const tally t = notes_in_random_scenes(1.0, 40.0, [](scene&, random_stream&) {});
    EXPECT_LE(t.direct_current + t.image, 1);
}

TEST(CoverageReceiverNotes, ImagesOf30DecibelsAreFound) {
    const tally t = notes_in_random_scenes(0.49, 45.0, [](scene& s, random_stream& draw) {
        add_image(
            s, std::polar(std::pow(10.0, -30.0 / 20.0), draw.uniform(0.0, 2.0 * std::numbers::pi)));
    });
    EXPECT_GE(t.image, 95);
    EXPECT_LE(t.direct_current, 1);
}

TEST(CoverageReceiverNotes, DirectCurrentWithin25DecibelsOfTheCarrierIsFound) {
    const tally t = notes_in_random_scenes(0.95, 60.0, [](scene& s, random_stream& draw) {
        s.receiver.dc_dbfs = s.carriers.front().level_dbfs - draw.uniform(0.0, 25.0);
        s.receiver.dc_phase_deg = draw.uniform(0.0, 360.0);
    });
    EXPECT_GE(t.direct_current, 95);
    EXPECT_LE(t.image, 1);
}

} // namespace
} // namespace tonewalk
