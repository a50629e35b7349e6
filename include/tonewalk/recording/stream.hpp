// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <cstdint>
#include <memory>
#include <optional>
#include <span>
#include <string>
#include <string_view>
#include <vector>

#include "tonewalk/base/note.hpp"
#include "tonewalk/base/quantity.hpp"
#include "tonewalk/base/sample.hpp"
#include "tonewalk/base/time.hpp"
#include "tonewalk/recording/sample_format.hpp"

namespace tonewalk {

/// A gapless run of samples with one centre frequency.
struct stretch_facts {
    sample_index first = 0;            ///< index among the samples stored in the recording
    std::optional<sample_index> count; ///< unknown only for a pipe
    sample_index position = 0; ///< of its first sample from the recording's first, gaps included
    std::optional<double> centre_hz;
};

/// What is known of a recording's samples, after the options that override it.
struct stream_facts {
    std::string name;        ///< as the user gave it
    sample_format format;    ///< of the bytes in raw_block
    std::string format_name; ///< of the recording: "ci16_le", "wav pcm24"
    unsigned code_bits = 0; ///< integer resolution in use (24 in an i32 container; else the type's)
    unsigned lanes = 1, lane = 0; ///< interleaved streams, and the one that is measured
    bool swap_iq = false, inverted = false;
    double sample_rate_hz = 0.0;
    std::optional<double> centre_hz;      ///< of the first stretch
    std::optional<utc_time> start_utc;    ///< of the recording's first sample
    std::vector<stretch_facts> stretches; ///< at least one, ascending; only what is to be measured
    bool seekable = true;
    std::string sha512; ///< hex; filled by --verify alone, else empty
    note_set notes;     ///< metadata-overridden, container-short, odd-tail, ...

    [[nodiscard]] std::size_t frame_bytes() const noexcept { return format.sample_bytes() * lanes; }
    [[nodiscard]] std::optional<sample_index>
    samples() const noexcept;                         ///< to be measured, all stretches
    [[nodiscard]] double duration_s() const noexcept; ///< samples / rate; 0 when unknown
    [[nodiscard]] double span_s() const noexcept;     ///< first to last sample, gaps included
    [[nodiscard]] std::string where() const; ///< its name in complaints: not "-", "standard input"
};

/// Frames (all lanes) of one stretch as stored: `lead` samples of history, then `count`. History is
/// never taken from another stretch: at a stretch's start lead is 0 or short, what is missing
/// counts as zeros.
struct raw_block {
    std::span<const std::byte> bytes;
    sample_index first = 0; ///< index of the first sample after the lead, among the stored ones
    std::size_t lead = 0, count = 0;
    std::uint32_t stretch = 0; ///< index in stream_facts::stretches
    bool ends_stretch = false; ///< for a pipe, true in the last block, which may be empty
};

/// Where samples come from: file, archive member, container, pipe.
class block_source {
public:
    virtual ~block_source() = default;
    [[nodiscard]] virtual const stream_facts& facts() const noexcept = 0;

    /// Up to `samples` frames from the start of what is to be measured; kept until the source is
    /// destroyed, and blocks still start at sample 0. A pipe reads them once and replays them.
    /// Never past the first stretch; before the first claim.
    virtual std::span<const std::byte> opening(std::size_t samples) = 0;

    /// Up to out.size()/frame_bytes frames at stored index `first`; seekable sources only. Returns
    /// frames read.
    virtual std::size_t probe(sample_index first, std::span<std::byte> out) = 0;

    /// Next block, in order; called under the pass's lock. At most slot.size()/frame_bytes frames
    /// together; after the lead, slot frames - lead, or what is left of the stretch. A pipe waits
    /// here for bytes. Nothing when the recording has ended or the wait was interrupted (wake()).
    virtual std::optional<raw_block> claim(std::span<std::byte> slot, std::size_t lead) = 0;

    /// Brings the bytes of a claimed block; concurrent calls for different blocks are allowed.
    /// Throws error{unreadable} when the file shrank or the device failed.
    virtual void fill(raw_block&) = 0;

    /// Makes a claim that waits, and all later ones, return nothing; but a pipe that is woken while
    /// it waits for its opening still hands out what came of it, as if it ended there.
    /// Async-signal-safe.
    virtual void wake() noexcept = 0;
};

/// What the user says about a recording (the options of every job that reads one); empty: take it
/// from the recording.
struct recording_request {
    std::string path; ///< "-" is standard input
    std::optional<sample_format> format;
    std::optional<double> rate_hz, centre_hz;
    std::optional<utc_time> start_utc;
    std::optional<unsigned> lane;
    std::string member;
    bool swap_iq = false, inverted = false;
    std::optional<moment> from, until;
    bool verify = false;
    int pipe_descriptor = 0; ///< where "-" reads; tests set it
};
/// Seconds from the recording's first sample, gaps included. Throws error{bad_request} for a time
/// of day where the recording does not say when it starts, error{malformed} before its first
/// sample.
[[nodiscard]] double seconds_into(const stream_facts&, const moment&, std::string_view option);

/// Throws tonewalk::error naming the file, the field or byte, and the mend.
[[nodiscard]] std::unique_ptr<block_source> open_recording(const recording_request&);

} // namespace tonewalk
