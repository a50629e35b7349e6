// SPDX-License-Identifier: GPL-3.0-or-later
#include <algorithm>
#include <cassert>
#include <utility>

#include "sources.hpp"

namespace tonewalk {
namespace {

// Components of 3 bytes, at the end of `frames`, become ones of 4 from its beginning; the added low
// byte is zero. No component is written before it has been read.
void widen_24_bits(std::span<std::byte> frames, bool big_endian) noexcept {
    const std::size_t components = frames.size() / 4;
    const std::byte* from = frames.data() + components;
    std::byte* to = frames.data();
    for (std::size_t k = 0; k < components; ++k, from += 3, to += 4) {
        const std::byte first = from[0], second = from[1], third = from[2];
        to[0] = big_endian ? first : std::byte{0};
        to[1] = big_endian ? second : first;
        to[2] = big_endian ? third : second;
        to[3] = big_endian ? std::byte{0} : third;
    }
}

class file_source final : public block_source {
public:
    file_source(stream_facts facts, input_file file, frame_storage storage)
        : facts_{std::move(facts)}, file_{std::move(file)}, storage_{std::move(storage)} {
        assert(storage_.origins.size() == facts_.stretches.size());
    }

    const stream_facts& facts() const noexcept override { return facts_; }

    std::span<const std::byte> opening(std::size_t samples) override {
        const auto wanted =
            std::min(static_cast<sample_index>(samples), *facts_.stretches.front().count);
        const auto size = static_cast<std::size_t>(wanted) * facts_.frame_bytes();
        if (opening_.size() < size) {
            opening_.resize(size);
            read(0, facts_.stretches.front().first, opening_);
        }
        return std::span{opening_}.first(size);
    }

    std::size_t probe(sample_index first, std::span<std::byte> out) override {
        const stretch_facts* const stretch = stretch_at(facts_, first);
        if (!stretch)
            return 0;
        const sample_index left = stretch->first + *stretch->count - first;
        const auto frames =
            std::min(out.size() / facts_.frame_bytes(), static_cast<std::size_t>(left));
        read(static_cast<std::size_t>(stretch - facts_.stretches.data()), first,
             out.first(frames * facts_.frame_bytes()));
        return frames;
    }

    std::optional<raw_block> claim(std::span<std::byte> slot, std::size_t lead) override {
        auto block = cutter_.next(facts_, slot.size() / facts_.frame_bytes(), lead);
        if (block)
            block->bytes = slot.first((block->lead + block->count) * facts_.frame_bytes());
        return block;
    }

    void fill(raw_block& block) override {
        // The bytes are the caller's own slot, given to claim as writable.
        const std::span slot{const_cast<std::byte*>(block.bytes.data()), block.bytes.size()};
        read(block.stretch, block.first - static_cast<sample_index>(block.lead), slot);
    }

    void wake() noexcept override { cutter_.stop(); }

private:
    // Frames from stored index `first` on, all in that stretch, until `out` is full.
    void read(std::size_t stretch, sample_index first, std::span<std::byte> out) const {
        const auto stored = [&](std::size_t bytes) {
            return storage_.packed_24_bits ? bytes / 4 * 3 : bytes;
        };
        const auto frame = static_cast<std::int64_t>(stored(facts_.frame_bytes()));
        file_.read_all_at(storage_.origins[stretch] + first * frame, out.last(stored(out.size())));
        if (storage_.packed_24_bits)
            widen_24_bits(out, facts_.format.big_endian);
    }

    stream_facts facts_;
    input_file file_;
    frame_storage storage_;
    block_cutter cutter_;
    std::vector<std::byte> opening_;
};

} // namespace

std::optional<raw_block> block_cutter::next(const stream_facts& facts, std::size_t slot_frames,
                                            std::size_t lead) {
    if (stopped_.load(std::memory_order_relaxed) || stretch_ == facts.stretches.size())
        return std::nullopt;
    assert(slot_frames > lead);
    const stretch_facts& stretch = facts.stretches[stretch_];
    const auto room = static_cast<sample_index>(slot_frames - lead);
    const sample_index count = std::min(room, *stretch.count - done_);
    raw_block block;
    block.first = stretch.first + done_;
    block.lead = std::min(lead, static_cast<std::size_t>(done_));
    block.count = static_cast<std::size_t>(count);
    block.stretch = static_cast<std::uint32_t>(stretch_);
    done_ += count;
    block.ends_stretch = done_ == *stretch.count;
    if (block.ends_stretch) {
        ++stretch_;
        done_ = 0;
    }
    return block;
}

const stretch_facts* stretch_at(const stream_facts& facts, sample_index index) noexcept {
    const auto found =
        std::find_if(facts.stretches.begin(), facts.stretches.end(), [&](const auto& stretch) {
            return index >= stretch.first && index < stretch.first + *stretch.count;
        });
    return found == facts.stretches.end() ? nullptr : &*found;
}

std::unique_ptr<block_source> make_file_source(stream_facts facts, input_file file,
                                               frame_storage storage) {
    return std::make_unique<file_source>(std::move(facts), std::move(file), std::move(storage));
}

} // namespace tonewalk
