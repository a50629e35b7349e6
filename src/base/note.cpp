// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/base/note.hpp"

#include <algorithm>
#include <array>
#include <cstddef>
#include <utility>

namespace tonewalk {
namespace {

constexpr auto last_code = note_code::residual_too_large;
constexpr std::array code_names = std::to_array<std::string_view>({
    "clipped",
    "compressed",
    "agc-suspected",
    "gain-step",
    "dc-in-channel",
    "image-in-channel",
    "samples-missing",
    "weak-carrier",
    "weak-tone",
    "no-tone",
    "no-steady-tone",
    "several-carriers",
    "carrier-in-channel",
    "envelope-suppressed",
    "floor-limited",
    "background-limited",
    "depth-varies",
    "carrier-varies",
    "overmodulated",
    "carrier-reference-line",
    "metadata-overridden",
    "centre-unknown",
    "hash-mismatch",
    "container-short",
    "non-finite-samples",
    "odd-tail",
    "sentences-skipped",
    "partial",
    "window-bound",
    "undersampled-places",
    "short-span",
    "skewed",
    "isolation-assumed",
    "places-extrapolated",
    "late-carrier",
    "segments-skipped",
    "channel-narrowed",
    "short-opening",
    "residual-too-large",
});
static_assert(code_names.size() == static_cast<std::size_t>(last_code) + 1);

} // namespace

std::string_view name(note_code code) noexcept {
    return code_names[static_cast<std::size_t>(code)];
}

std::string_view name(severity level) noexcept {
    return level == severity::info ? "info" : "warning";
}

void note_set::add(note addition) {
    if (!has(addition.code))
        notes_.push_back(std::move(addition));
}

void note_set::merge(const note_set& other) {
    for (const note& each : other.notes_)
        add(each);
}

bool note_set::has(note_code code) const noexcept {
    return std::any_of(notes_.begin(), notes_.end(),
                       [code](const note& each) { return each.code == code; });
}

const std::vector<std::string>& general_cautions() {
    static const std::vector<std::string> cautions{
        "RF near a transmitting antenna can injure: keep the safe distance.",
        "Climb only trained and secured; never watch readings while moving.",
        "Transmitters hold mains and high voltage: leave them to the qualified.",
        "The licence and the local rules decide what may be transmitted.",
        "These are measurements, no certificate of safety or compliance.",
    };
    return cautions;
}

} // namespace tonewalk
