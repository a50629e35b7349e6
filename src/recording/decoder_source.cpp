// SPDX-License-Identifier: GPL-3.0-or-later
#include <algorithm>
#include <mutex>
#include <utility>

#include <fmt/format.h>

#include "frame_history.hpp"
#include "sources.hpp"

namespace tonewalk {
namespace {

// One decoder, so that all reading is in order, in claim.
class decoder_source final : public block_source {
public:
    decoder_source(stream_facts facts, std::unique_ptr<frame_decoder> decoder)
        : facts_{std::move(facts)}, decoder_{std::move(decoder)} {}

    const stream_facts& facts() const noexcept override { return facts_; }

    std::span<const std::byte> opening(std::size_t samples) override {
        const stretch_facts& stretch = facts_.stretches.front();
        const auto wanted =
            static_cast<std::size_t>(std::min(static_cast<sample_index>(samples), *stretch.count));
        if (opening_.size() < wanted * facts_.frame_bytes()) {
            opening_.resize(wanted * facts_.frame_bytes());
            opening_.resize(read(stretch.first, opening_) * facts_.frame_bytes());
        }
        return std::span{opening_}.first(std::min(opening_.size(), wanted * facts_.frame_bytes()));
    }

    std::size_t probe(sample_index first, std::span<std::byte> out) override {
        const stretch_facts* const stretch = stretch_at(facts_, first);
        if (!stretch)
            return 0;
        const auto left = static_cast<std::size_t>(stretch->first + *stretch->count - first);
        return read(first, out.first(std::min(out.size() / facts_.frame_bytes(), left) *
                                     facts_.frame_bytes()));
    }

    std::optional<raw_block> claim(std::span<std::byte> slot, std::size_t lead) override {
        const std::size_t frame = facts_.frame_bytes();
        auto block = cutter_.next(facts_, slot.size() / frame, lead);
        if (!block)
            return std::nullopt;
        if (block->lead == 0)
            history_.clear();
        block->lead = history_.give(slot, block->lead, frame);
        const auto wanted = block->count;
        block->count = read(block->first, slot.subspan(block->lead * frame, wanted * frame));
        if (block->count < wanted)
            end_early(*block);
        block->bytes = slot.first((block->lead + block->count) * frame);
        history_.keep(block->bytes, lead, frame);
        return block;
    }

    void fill(raw_block&) override {}
    void wake() noexcept override { cutter_.stop(); }

private:
    std::size_t read(sample_index first, std::span<std::byte> out) {
        const std::lock_guard lock{mutex_};
        if (first != next_)
            decoder_->seek(first);
        const std::size_t frames = decoder_->read(out);
        next_ = first + static_cast<sample_index>(frames);
        return frames;
    }

    // A container that cannot be decoded as far as its header says is measured as far as it goes.
    void end_early(raw_block& block) {
        stretch_facts& stretch = facts_.stretches[block.stretch];
        const sample_index end = block.first + static_cast<sample_index>(block.count);
        facts_.notes.add({note_code::container_short, severity::warning,
                          fmt::format("the header says {} samples, only {} could be decoded",
                                      stretch.first + *stretch.count, end),
                          "copy the file again if it was cut off"});
        stretch.count = end - stretch.first;
        block.ends_stretch = true;
        cutter_.stop();
    }

    stream_facts facts_;
    std::unique_ptr<frame_decoder> decoder_;
    std::mutex mutex_;
    sample_index next_ = 0; // frame that the decoder stands at
    block_cutter cutter_;
    frame_history history_;
    std::vector<std::byte> opening_;
};

} // namespace

std::unique_ptr<block_source> make_decoder_source(stream_facts facts,
                                                  std::unique_ptr<frame_decoder> decoder) {
    return std::make_unique<decoder_source>(std::move(facts), std::move(decoder));
}

} // namespace tonewalk
