// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/report/report_context.hpp"

#include <algorithm>

namespace tonewalk {
namespace {

/// Samples from the first measured one to the last, gaps included.
sample_index span_samples(const std::vector<stretch_facts>& stretches, sample_index measured) {
    sample_index span = 0;
    for (const stretch_facts& each : stretches) {
        const sample_index here = std::min(measured, each.count.value_or(measured));
        if (here > 0)
            span = each.position - stretches.front().position + here;
        measured -= here;
    }
    return span;
}

} // namespace

recording_summary summarise(const stream_facts& facts, sample_index measured, bool partial) {
    recording_summary summary;
    summary.name = facts.name;
    summary.format = facts.format_name;
    summary.sample_rate_hz = facts.sample_rate_hz;
    summary.centre_hz = facts.centre_hz;
    summary.start_utc = facts.start_utc;
    summary.samples = measured;
    summary.duration_s = static_cast<double>(measured) / facts.sample_rate_hz;
    summary.span_s =
        static_cast<double>(span_samples(facts.stretches, measured)) / facts.sample_rate_hz;
    summary.sha512 = facts.sha512;
    summary.partial = partial;
    return summary;
}

const sheet_table* find_table(const sheet& page, std::string_view key) noexcept {
    for (const auto& item : page.items) {
        const auto* table = std::get_if<sheet_table>(&item);
        if (table != nullptr && table->key == key)
            return table;
        if (const auto* group = std::get_if<sheet_group>(&item))
            for (const sheet& part : group->parts)
                if (const sheet_table* inside = find_table(part, key))
                    return inside;
    }
    return nullptr;
}

const sheet_column* find_column(const sheet_table& table, std::string_view key) noexcept {
    for (const sheet_column& each : table.columns)
        if (each.key == key)
            return &each;
    return nullptr;
}

} // namespace tonewalk
