// SPDX-License-Identifier: GPL-3.0-or-later
#include "search_opening.hpp"

#include <algorithm>
#include <cmath>

#include "tonewalk/base/error.hpp"

namespace tonewalk {
namespace {

constexpr double opening_s = 2.0, probe_s = 1.0;
constexpr std::size_t most_bytes = std::size_t{32} * 1024 * 1024;

/// Samples in so many seconds, as far as they fit into most_bytes.
std::size_t samples_in(double seconds, const stream_facts& facts) {
    const auto wanted = static_cast<std::size_t>(std::ceil(seconds * facts.sample_rate_hz));
    return std::min(wanted, most_bytes / facts.frame_bytes());
}

double centre_shift(const stretch_facts& stretch, const stream_facts& facts) {
    return stretch.centre_hz && facts.centre_hz ? *stretch.centre_hz - *facts.centre_hz : 0.0;
}

} // namespace

opening look_at_opening(block_source& source, const sample_converter& converter) {
    const stream_facts& facts = source.facts();
    std::size_t wanted = samples_in(opening_s, facts);
    if (facts.stretches.front().count) {
        wanted = std::min(wanted, static_cast<std::size_t>(*facts.stretches.front().count));
    }
    const std::span<const std::byte> bytes = source.opening(wanted);
    const std::size_t frames = std::min(wanted, bytes.size() / facts.frame_bytes());
    if (frames == 0) {
        throw error{fault::malformed, "holds no samples", facts.where(),
                    "give a recording that does"};
    }
    return {{}, {bytes, frames, &facts, &converter, centre_shift(facts.stretches.front(), facts)}};
}

std::size_t probes_in(const stream_facts& facts) {
    const auto total = static_cast<std::size_t>(facts.samples().value_or(0));
    return std::clamp<std::size_t>(total / samples_in(probe_s, facts), 1, most_probes);
}

opening look_at_probe(block_source& source, const sample_converter& converter, std::size_t k,
                      std::size_t probes) {
    const stream_facts& facts = source.facts();
    const sample_index total = facts.samples().value_or(0);
    const auto length = std::min(total, static_cast<sample_index>(samples_in(probe_s, facts)));
    const auto last = static_cast<sample_index>(std::max<std::size_t>(1, probes - 1));
    sample_index skip = (total - length) * static_cast<sample_index>(k) / last;
    for (const stretch_facts& stretch : facts.stretches) {
        const sample_index count = stretch.count.value_or(0);
        if (skip < count) {
            const auto frames = static_cast<std::size_t>(std::min(length, count - skip));
            opening o{std::vector<std::byte>(frames * facts.frame_bytes()), {}};
            const std::size_t got = source.probe(stretch.first + skip, o.own);
            o.what = {std::span<const std::byte>{o.own}.first(got * facts.frame_bytes()), got,
                      &facts, &converter, centre_shift(stretch, facts)};
            return o;
        }
        skip -= count;
    }
    return {{}, {{}, 0, &facts, &converter, 0.0}};
}

} // namespace tonewalk
