// SPDX-License-Identifier: GPL-3.0-or-later
#include "search_opening.hpp"

#include <algorithm>
#include <cmath>

namespace tonewalk {
namespace {

constexpr double opening_s = 2.0, probe_s = 1.0;
constexpr std::size_t most_bytes = std::size_t{32} * 1024 * 1024;

/// Samples in so many seconds, as far as they fit into most_bytes.
std::size_t samples_in(double seconds, const stream_facts& facts) {
    const auto wanted = static_cast<std::size_t>(std::ceil(seconds * facts.sample_rate_hz));
    return std::min(wanted, most_bytes / facts.frame_bytes());
}

} // namespace

opening look_at_opening(block_source& source, const sample_converter& converter) {
    const stream_facts& facts = source.facts();
    std::size_t wanted = samples_in(opening_s, facts);
    if (facts.stretches.front().count) {
        wanted = std::min(wanted, static_cast<std::size_t>(*facts.stretches.front().count));
    }
    const std::span<const std::byte> bytes = source.opening(wanted);
    return {{}, {bytes, std::min(wanted, bytes.size() / facts.frame_bytes()), &facts, &converter}};
}

opening look_at_probe(block_source& source, const sample_converter& converter, std::size_t k) {
    const stream_facts& facts = source.facts();
    const sample_index total = facts.samples().value_or(0);
    const auto length = std::min(total, static_cast<sample_index>(samples_in(probe_s, facts)));
    sample_index skip =
        (total - length) * static_cast<sample_index>(k) / static_cast<sample_index>(probes - 1);
    for (const stretch_facts& stretch : facts.stretches) {
        const sample_index count = stretch.count.value_or(0);
        if (skip < count) {
            const auto frames = static_cast<std::size_t>(std::min(length, count - skip));
            opening o{std::vector<std::byte>(frames * facts.frame_bytes()), {}};
            const std::size_t got = source.probe(stretch.first + skip, o.own);
            o.what = {std::span<const std::byte>{o.own}.first(got * facts.frame_bytes()), got,
                      &facts, &converter};
            return o;
        }
        skip -= count;
    }
    return {{}, {{}, 0, &facts, &converter}};
}

} // namespace tonewalk
