// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <cmath>
#include <complex>
#include <functional>
#include <memory>
#include <numbers>
#include <span>
#include <vector>

#include "support/baseband_recorder.hpp"
#include "support/memory_source.hpp"
#include "tonewalk/base/random.hpp"
#include "tonewalk/channel/channel_chain.hpp"
#include "tonewalk/pass/run_pass.hpp"

namespace tonewalk::test {

/// A carrier and noise, so that every sample counts.
inline std::vector<cf32> carrier_in_noise(double hz, double rate_hz, std::size_t samples,
                                          std::uint64_t seed = 1) {
    random_stream random{seed};
    std::vector<cf32> out(samples);
    for (std::size_t n = 0; n < samples; ++n) {
        const double turns = std::fmod(hz / rate_hz * static_cast<double>(n), 1.0);
        const auto z = std::polar(0.5, 2.0 * std::numbers::pi * turns);
        out[n] = {static_cast<float>(z.real() + random.uniform(-0.2, 0.2)),
                  static_cast<float>(z.imag() + random.uniform(-0.2, 0.2))};
    }
    return out;
}

struct outcome {
    pass_report report;
    baseband_recorder heard;
    raw_result raw;
};

/// One channel through a whole pass.
inline outcome run_through(block_source& source, const channel_plan& plan,
                           const run_control& control = {}, const pass_tuning& tuning = {},
                           baseband_sink* another = nullptr) {
    const auto front = front_end::make(source.facts(), std::span{&plan, 1});
    channel_chain channel{*front, 0, plan, source.facts()};
    outcome result;
    channel.listen(result.heard);
    if (another != nullptr) {
        channel.listen(*another);
    }
    raw_watch watch{source.facts()};
    chain* const chains[] = {&channel};
    result.report = run_pass(source, *front, chains, watch, control, tuning);
    result.raw = watch.result();
    return result;
}

inline void expect_same(const outcome& a, const outcome& b) {
    EXPECT_EQ(a.report.samples, b.report.samples);
    ASSERT_EQ(a.heard.stretches.size(), b.heard.stretches.size());
    for (std::size_t k = 0; k < a.heard.stretches.size(); ++k) {
        EXPECT_TRUE(same_bits(a.heard.stretches[k].iq, b.heard.stretches[k].iq)) << k;
        EXPECT_EQ(a.heard.stretches[k].touched, b.heard.stretches[k].touched) << k;
        EXPECT_EQ(a.heard.stretches[k].about.start_s, b.heard.stretches[k].about.start_s);
        EXPECT_EQ(a.heard.stretches[k].about.held, b.heard.stretches[k].about.held);
    }
    EXPECT_EQ(a.raw.samples, b.raw.samples);
    EXPECT_EQ(a.raw.rms_dbfs, b.raw.rms_dbfs);
    EXPECT_EQ(a.raw.peak_dbfs, b.raw.peak_dbfs);
    EXPECT_EQ(a.raw.dc_dbfs, b.raw.dc_dbfs);
    EXPECT_EQ(a.raw.headroom_db, b.raw.headroom_db);
    EXPECT_EQ(a.raw.clipped_samples, b.raw.clipped_samples);
}

} // namespace tonewalk::test
