// SPDX-License-Identifier: GPL-3.0-or-later
#include <functional>
#include <map>
#include <string>

#include <gtest/gtest.h>

#include "receiver_scenes.hpp"

namespace tonewalk::test {
namespace {

// Drawn once, after the thresholds stood; never changed to pass.
constexpr std::uint64_t final_seed = 20'261'201;
constexpr int scenes = 100;
constexpr int most_false = 1, most_missed = 5;

constexpr note_code receiver_faults[] = {note_code::clipped, note_code::compressed,
                                         note_code::agc_suspected, note_code::gain_step};

/// In how many of a hundred scenes each note was raised.
using raised = std::map<note_code, int>;

raised notes_in(std::uint64_t kind, const std::function<scene(random_stream&)>& draw,
                const std::function<note_set(const scene&)>& measure) {
    random_stream random{final_seed, kind};
    raised counts;
    for (int k = 0; k < scenes; ++k) {
        const note_set doubts = measure(draw(random));
        for (const note_code code : receiver_faults) {
            counts[code] += doubts.has(code) ? 1 : 0;
        }
    }
    return counts;
}

void expect_none_but(const raised& counts, std::initializer_list<note_code> allowed) {
    for (const auto& [code, count] : counts) {
        if (std::find(allowed.begin(), allowed.end(), code) == allowed.end()) {
            EXPECT_LE(count, most_false) << name(code);
        }
    }
}

TEST(CoverageReceiverFaults, CleanFadesOfTwentyDecibelsRaiseNone) {
    expect_none_but(notes_in(
                        1, [](random_stream& r) { return random_scene(r, {}); }, notes_of),
                    {});
}

TEST(CoverageReceiverFaults, CleanFadesOfSixtyDecibelsRaiseNone) {
    const auto draw = [](random_stream& r) { return random_scene(r, {.fade_db = 60.0}); };
    expect_none_but(notes_in(2, draw, notes_of), {});
}

// Waves that come up to 0.2 ms late fade carrier and sidebands apart; the transmitter's own second
// and third harmonic, to 5 % of the tone each, fade with them.
TEST(CoverageReceiverFaults, SelectiveFadesOfADistortingTransmitterRaiseNone) {
    const auto draw = [](random_stream& r) {
        scene s = random_scene(r, {});
        s.carriers.front().tones.front().harmonics = {
            {2, r.uniform(1.0, 5.0), r.uniform(0.0, 360.0)},
            {3, r.uniform(0.0, 5.0), r.uniform(0.0, 360.0)}};
        for (scene_wave& wave : s.carriers.front().waves) {
            wave.delay_s = r.uniform(0.0, 0.0002);
        }
        return s;
    };
    expect_none_but(notes_in(3, draw, notes_of), {});
}

// From 65 dBHz of carrier to noise density at the peaks: below, the carrier's own step drowns.
TEST(CoverageReceiverFaults, GainStepsOfHalfADecibelAreFound) {
    const auto draw = [](random_stream& r) {
        scene s = random_scene(r, {.seconds = 20.0, .weakest_dbhz = 65.0});
        s.receiver.gain_steps = {{10.0, r.uniform() < 0.5 ? 0.5 : -0.5}};
        return s;
    };
    const raised counts = notes_in(4, draw, notes_of);
    EXPECT_GE(counts.at(note_code::gain_step), scenes - most_missed);
    expect_none_but(counts, {note_code::gain_step});
}

// The gain moves between two stops, a decibel apart, as the carrier passes some level of its fade
// below which it spends a fifth to four fifths of its time. From 60 dBHz at the peaks: below, the
// noise of the whole band holds the gain control still.
TEST(CoverageReceiverFaults, GainControlOfADecibelIsFound) {
    const auto draw = [](random_stream& r) {
        const scene_ranges ranges{.seconds = 30.0, .seen_db = 15.0, .weakest_dbhz = 60.0};
        scene s = random_scene(r, ranges);
        s.receiver.gain_control =
            scene_gain_control{.target_dbfs = level_quantile_dbfs(s, r.uniform(0.2, 0.8)),
                               .attack_s = r.uniform(0.002, 0.1),
                               .release_s = r.uniform(0.1, 1.0),
                               .least_db = -1.0,
                               .most_db = 0.0};
        return s;
    };
    const raised counts = notes_in(5, draw, notes_of);
    EXPECT_GE(counts.at(note_code::agc_suspected), scenes - most_missed);
    expect_none_but(counts, {note_code::agc_suspected});
}

// Half a decibel to 3 dB off the crests at the highest level, from 65 dBHz and 30 % of depth. The
// program tells gain control of the compression, which takes the noise down with strong signals.
TEST(CoverageReceiverFaults, CompressionIsFound) {
    const auto draw = [](random_stream& r) {
        scene s =
            random_scene(r, {.seconds = 30.0, .weakest_dbhz = 65.0, .least_depth_percent = 30.0});
        const double lost = std::pow(10.0, r.uniform(0.5, 3.0) / 10.0) - 1.0; // r^2/s^2
        const double one_db = std::pow(10.0, 0.1) - 1.0;
        const double depth = s.carriers.front().tones.front().depth_percent / 100.0;
        s.receiver.compression_dbfs = level_quantile_dbfs(s, 1.0) + 20.0 * std::log10(1.0 + depth) -
                                      10.0 * std::log10(lost / one_db);
        return s;
    };
    const raised counts = notes_in(6, draw, notes_of);
    EXPECT_GE(counts.at(note_code::compressed), scenes - most_missed);
    expect_none_but(counts, {note_code::compressed});
}

TEST(CoverageReceiverFaults, OneClippedSampleInAThousandIsFound) {
    for (const char* const format : {"ci16_le", "cf32_le"}) {
        const auto draw = [format](random_stream& r) {
            const scene_ranges ranges{
                .seconds = 30.0, .seen_db = 6.0, .weakest_dbhz = 65.0, .least_depth_percent = 30.0};
            scene s = random_scene(r, ranges);
            s.format = parse_sample_format(format).value();
            s.receiver.clip_dbfs = component_quantile_dbfs(s, 0.999);
            return s;
        };
        const raised counts = notes_in(7, draw, raw_notes_of);
        EXPECT_GE(counts.at(note_code::clipped), scenes - most_missed) << format;
    }
}

} // namespace
} // namespace tonewalk::test
