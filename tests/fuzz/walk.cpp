// SPDX-License-Identifier: GPL-3.0-or-later
#include "walk.hpp"

#include <algorithm>
#include <vector>

#include "targets.hpp"
#include "tonewalk/recording/convert.hpp"

namespace tonewalk::fuzz {
namespace {

constexpr std::size_t most_blocks = 64;

void check_facts(const stream_facts& facts) {
    promise(facts.sample_rate_hz > 0.0 && facts.sample_rate_hz <= 1e12, "a rate out of range");
    promise(facts.lanes >= 1 && facts.lane < facts.lanes, "a lane that is not there");
    promise(!facts.stretches.empty(), "a recording without a stretch");
    stretch_order order;
    for (const stretch_facts& stretch : facts.stretches)
        order.add(stretch);
}

void check_block(const raw_block& block, const stream_facts& facts, std::size_t slot_bytes) {
    promise(block.bytes.size() == (block.lead + block.count) * facts.frame_bytes(),
            "a block whose bytes are not its frames");
    promise(block.bytes.size() <= slot_bytes, "a block larger than its slot");
    promise(block.stretch < facts.stretches.size(), "a block of no stretch");
    const stretch_facts& stretch = facts.stretches[block.stretch];
    promise(block.first - static_cast<sample_index>(block.lead) >= stretch.first &&
                block.first + static_cast<sample_index>(block.count) <=
                    stretch.first + *stretch.count,
            "a block beyond its stretch");
}

void read_blocks(block_source& source) {
    constexpr std::size_t slot_frames = 512, lead = 3;
    std::vector<std::byte> slot(slot_frames * source.facts().frame_bytes());
    std::vector<cf32> samples(slot_frames);
    const sample_converter converter{source.facts()};
    for (std::size_t k = 0; k < most_blocks; ++k) {
        auto block = source.claim(slot, lead);
        if (!block)
            return;
        source.fill(*block);
        check_block(*block, source.facts(), slot.size());
        converter.convert(block->bytes, std::span{samples}.first(block->lead + block->count));
    }
}

void read_last(block_source& source) {
    const stretch_facts& last = source.facts().stretches.back();
    if (last.count.value_or(0) == 0) // it turned out to be shorter than its header says
        return;
    std::vector<std::byte> frame(source.facts().frame_bytes());
    promise(source.probe(last.first + *last.count - 1, frame) <= 1, "more frames than asked for");
}

} // namespace

void stretch_order::add(const stretch_facts& stretch) {
    promise(stretch.count.value_or(0) > 0, "a stretch without samples");
    promise(stretch.first >= stored_, "stretches that share samples");
    promise(stretch.position >= position_, "stretches that overlap in time");
    stored_ = stretch.first + *stretch.count;
    position_ = stretch.position + *stretch.count;
}

void walk(block_source& source) {
    check_facts(source.facts());
    constexpr std::size_t opening_frames = 100;
    promise(source.opening(opening_frames).size() <= opening_frames * source.facts().frame_bytes(),
            "an opening longer than asked for");
    read_blocks(source);
    read_last(source);
}

} // namespace tonewalk::fuzz
