// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <algorithm>
#include <atomic>
#include <chrono>
#include <cstring>
#include <functional>
#include <optional>
#include <span>
#include <string_view>
#include <thread>
#include <utility>
#include <vector>

#include "tonewalk/base/error.hpp"
#include "tonewalk/recording/stream.hpp"

namespace tonewalk::test {

template <class Item>
std::vector<std::byte> bytes_of(const std::vector<Item>& items) {
    const auto bytes = std::as_bytes(std::span{items});
    return {bytes.begin(), bytes.end()};
}

/// A recording of one stretch; add to `stretches` for more.
inline stream_facts facts_of(std::string_view format, double rate_hz, std::size_t samples) {
    stream_facts facts;
    facts.name = "memory";
    facts.format = parse_sample_format(format).value();
    facts.format_name = format;
    facts.sample_rate_hz = rate_hz;
    facts.stretches.emplace_back();
    facts.stretches.back().count = static_cast<sample_index>(samples);
    return facts;
}

/// A recording in memory. Stored index n stands at byte n x frame_bytes().
class memory_source : public block_source {
public:
    memory_source(stream_facts facts, std::vector<std::byte> frames)
        : facts_{std::move(facts)}, frames_{std::move(frames)} {}

    /// Filling a block that holds this stored sample throws error{unreadable}, after a while.
    void fail_at(sample_index index, std::chrono::milliseconds after = {}) noexcept {
        fails_at_ = index;
        fails_after_ = after;
    }
    /// Called when the block that holds this stored sample is claimed.
    void on_claim(sample_index index, std::function<void()> action) {
        action_at_ = index;
        action_ = std::move(action);
    }

    const stream_facts& facts() const noexcept override { return facts_; }
    std::span<const std::byte> opening(std::size_t samples) override {
        const auto all = static_cast<std::size_t>(*facts_.stretches.front().count);
        return std::span{frames_}.first(std::min(samples, all) * facts_.frame_bytes());
    }
    std::size_t probe(sample_index first, std::span<std::byte> out) override {
        const std::size_t from = static_cast<std::size_t>(first) * facts_.frame_bytes();
        const std::size_t size = std::min(out.size(), frames_.size() - from);
        std::memcpy(out.data(), frames_.data() + from, size);
        return size / facts_.frame_bytes();
    }

    std::optional<raw_block> claim(std::span<std::byte> slot, std::size_t lead) override {
        if (woken_ || stretch_ == facts_.stretches.size()) {
            return std::nullopt;
        }
        const stretch_facts& stretch = facts_.stretches[stretch_];
        const auto room = static_cast<sample_index>(slot.size() / facts_.frame_bytes() - lead);
        raw_block block;
        block.first = stretch.first + done_;
        block.count = static_cast<std::size_t>(std::min(room, *stretch.count - done_));
        block.lead = std::min(lead, static_cast<std::size_t>(done_));
        block.stretch = static_cast<std::uint32_t>(stretch_);
        block.bytes = slot.first((block.lead + block.count) * facts_.frame_bytes());
        done_ += static_cast<sample_index>(block.count);
        if (done_ == *stretch.count) {
            block.ends_stretch = true;
            ++stretch_;
            done_ = 0;
        }
        if (holds(block, action_at_)) {
            action_();
        }
        return block;
    }

    void fill(raw_block& block) override {
        if (holds(block, fails_at_)) {
            std::this_thread::sleep_for(fails_after_);
            throw error{fault::unreadable, "cannot be read", facts_.name, "read it again"};
        }
        const auto from = static_cast<std::size_t>(block.first) - block.lead;
        // The bytes are the caller's own slot, given to claim as writable.
        std::memcpy(const_cast<std::byte*>(block.bytes.data()),
                    frames_.data() + from * facts_.frame_bytes(), block.bytes.size());
    }

    void wake() noexcept override { woken_ = true; }

private:
    static bool holds(const raw_block& block, sample_index index) noexcept {
        return index >= block.first && index < block.first + static_cast<sample_index>(block.count);
    }

    stream_facts facts_;
    std::vector<std::byte> frames_;
    std::size_t stretch_ = 0;
    sample_index done_ = 0; // of the stretch
    sample_index fails_at_ = -1, action_at_ = -1;
    std::chrono::milliseconds fails_after_{};
    std::function<void()> action_;
    std::atomic<bool> woken_ = false;
};

} // namespace tonewalk::test
