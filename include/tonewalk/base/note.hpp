// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <string>
#include <string_view>
#include <vector>

namespace tonewalk {

/// Every doubt or remark that a result can carry; spelled with hyphens in outputs (name()).
/// Thresholds stand in docs/results.md.
enum class note_code {
    clipped,
    compressed,
    agc_suspected,
    gain_step,
    dc_in_channel,
    image_in_channel,
    samples_missing,
    weak_carrier,
    weak_tone,
    no_tone,
    no_steady_tone,
    several_carriers,
    carrier_in_channel,
    envelope_suppressed,
    floor_limited,
    background_limited,
    depth_varies,
    carrier_varies,
    overmodulated,
    carrier_reference_line,
    metadata_overridden,
    centre_unknown,
    hash_mismatch,
    container_short,
    non_finite_samples,
    odd_tail,
    sentences_skipped,
    partial,
    window_bound,
    undersampled_places,
    short_span,
    skewed,
    isolation_assumed,
    places_extrapolated,
    late_carrier,
    segments_skipped,
    channel_narrowed,
    short_opening,
    residual_too_large
};
enum class severity { info, warning };

[[nodiscard]] std::string_view name(note_code) noexcept; ///< "agc-suspected"
[[nodiscard]] std::string_view name(severity) noexcept;  ///< "info", "warning"

/// One remark: text says what was seen, with figures; advice says what to do.
struct note {
    note_code code{};
    severity level = severity::warning;
    std::string text;
    std::string advice;
};

/// Notes in the order in which they arose; a code already present is not added again.
class note_set {
public:
    void add(note);
    void merge(const note_set&);
    [[nodiscard]] bool has(note_code) const noexcept;
    [[nodiscard]] const std::vector<note>& all() const noexcept { return notes_; }

private:
    std::vector<note> notes_;
};

/// Cautions that stand on outputs: the work can hurt people. One sentence each, general, deferring
/// to local rules and licensed practice; never a verdict.
[[nodiscard]] const std::vector<std::string>& general_cautions();

} // namespace tonewalk
