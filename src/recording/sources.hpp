// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <atomic>
#include <cstdint>
#include <memory>
#include <vector>

#include "input_file.hpp"
#include "tonewalk/recording/stream.hpp"

namespace tonewalk {

/// Cuts the stretches of seekable sources into blocks, in order.
class block_cutter {
public:
    /// The next block but for its bytes; nothing after the last, or once stopped.
    std::optional<raw_block> next(const stream_facts&, std::size_t slot_frames, std::size_t lead);
    void stop() noexcept { stopped_.store(true, std::memory_order_relaxed); }

private:
    std::size_t stretch_ = 0;
    sample_index done_ = 0; // of the stretch
    std::atomic<bool> stopped_ = false;
};

/// The stretch that holds stored index `index`; null when none does.
[[nodiscard]] const stretch_facts* stretch_at(const stream_facts&, sample_index index) noexcept;

/// How frames lie in a file.
struct frame_storage {
    /// For each stretch, where in the file the recording's frame 0 would lie if there were nothing
    /// but frames between: frame n of the stretch is n frames further.
    std::vector<std::int64_t> origins;
    bool packed_24_bits = false; ///< 3 bytes a component, widened to 4 when read
};
/// Frames that lie in a file as they are: data files, archive members, uncompressed containers.
[[nodiscard]] std::unique_ptr<block_source> make_file_source(stream_facts, input_file,
                                                             frame_storage);

/// What turns a compressed container into frames.
class frame_decoder {
public:
    virtual ~frame_decoder() = default;
    virtual void seek(sample_index frame) = 0;
    /// Frames read, fewer than out holds only at the end.
    virtual std::size_t read(std::span<std::byte> out) = 0;
};
[[nodiscard]] std::unique_ptr<block_source> make_decoder_source(stream_facts,
                                                                std::unique_ptr<frame_decoder>);

/// Frames read from a descriptor as they come. `facts` has one stretch; its count, if any, is where
/// to stop. The descriptor is closed at the end if `owned`.
[[nodiscard]] std::unique_ptr<block_source> make_pipe_source(stream_facts, int descriptor,
                                                             bool owned);

} // namespace tonewalk
