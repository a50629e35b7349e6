// SPDX-License-Identifier: GPL-3.0-or-later
#include <algorithm>
#include <cassert>
#include <cerrno>
#include <system_error>
#include <utility>

#include <fmt/format.h>
#include <poll.h>
#include <sys/eventfd.h>
#include <unistd.h>

#include "frame_history.hpp"
#include "sources.hpp"
#include "stated.hpp"
#include "tonewalk/base/error.hpp"

namespace tonewalk {
namespace {

// A descriptor that is waited for; wake() ends every wait, also from a signal handler.
class pipe_reader {
public:
    pipe_reader(std::string name, int descriptor, bool owned)
        : name_{std::move(name)},
          descriptor_{descriptor}, owned_{owned}, bell_{::eventfd(0, EFD_CLOEXEC | EFD_NONBLOCK)} {
        if (bell_ < 0)
            throw std::system_error{errno, std::generic_category(), "eventfd"};
    }
    pipe_reader(const pipe_reader&) = delete;
    pipe_reader& operator=(const pipe_reader&) = delete;
    ~pipe_reader() {
        ::close(bell_);
        if (owned_)
            ::close(descriptor_);
    }

    bool ended() const noexcept { return ended_; }
    bool woken() const noexcept { return woken_.load(std::memory_order_relaxed); }
    void wake() noexcept {
        woken_.store(true, std::memory_order_relaxed);
        const int saved = errno;
        const std::uint64_t one = 1;
        // The bell can only be full, which wakes as well.
        [[maybe_unused]] const auto rung = ::write(bell_, &one, sizeof one);
        errno = saved;
    }

    // Waits until `out` is full, the pipe has ended, or wake(); returns the bytes read.
    std::size_t read(std::span<std::byte> out) {
        std::size_t done = 0;
        while (done < out.size() && !ended_ && wait()) {
            const ::ssize_t part = ::read(descriptor_, out.data() + done, out.size() - done);
            if (part > 0)
                done += static_cast<std::size_t>(part);
            else if (part == 0)
                ended_ = true;
            else if (errno != EINTR && errno != EAGAIN)
                fail();
        }
        return done;
    }

private:
    // Whether there is something to read; false once woken.
    bool wait() {
        std::array<::pollfd, 2> watched{{{descriptor_, POLLIN, 0}, {bell_, POLLIN, 0}}};
        while (!woken()) {
            if (::poll(watched.data(), watched.size(), -1) < 0) {
                if (errno != EINTR)
                    fail();
            } else if (watched[0].revents != 0) {
                return !woken();
            }
        }
        return false;
    }

    [[noreturn]] void fail() const {
        throw error{fault::unreadable,
                    fmt::format("cannot be read ({})", std::generic_category().message(errno)),
                    name_, "check what writes to it"};
    }

    std::string name_;
    int descriptor_;
    bool owned_;
    int bell_;
    bool ended_ = false;
    std::atomic<bool> woken_ = false;
    static_assert(std::atomic<bool>::is_always_lock_free);
};

class pipe_source final : public block_source {
public:
    pipe_source(stream_facts facts, int descriptor, bool owned)
        : facts_{std::move(facts)}, reader_{facts_.where(), descriptor, owned} {
        assert(facts_.stretches.size() == 1);
        limit_ = std::exchange(facts_.stretches.front().count, std::nullopt);
    }

    const stream_facts& facts() const noexcept override { return facts_; }

    std::span<const std::byte> opening(std::size_t samples) override {
        const std::size_t size = samples * facts_.frame_bytes();
        const std::size_t had = opening_.size();
        assert(handed_out_ == 0 || size <= had); // what was handed out cannot be read again
        if (size > had) {
            opening_.resize(size);
            opening_.resize(had + read(std::span{opening_}.subspan(had)));
        }
        return std::span{opening_}.first(std::min(size, opening_.size()));
    }

    std::size_t probe(sample_index, std::span<std::byte>) override { return 0; }

    std::optional<raw_block> claim(std::span<std::byte> slot, std::size_t lead) override {
        const std::size_t frame = facts_.frame_bytes();
        assert(slot.size() / frame > lead);
        if (finished_)
            return std::nullopt;
        raw_block block;
        block.lead = history_.give(slot, lead, frame);
        const std::size_t room = (slot.size() / frame - lead) * frame;
        const bool opening_only = reader_.woken();
        const std::size_t size = replay_or_read(slot.subspan(block.lead * frame, room));
        if (opening_only ? size == 0 : reader_.woken())
            return std::nullopt;
        block.first = facts_.stretches.front().first + handed_out_;
        block.count = size / frame;
        block.bytes = slot.first(block.lead * frame + size);
        block.ends_stretch = finished_ = size < room || at_limit();
        handed_out_ += static_cast<sample_index>(block.count);
        history_.keep(block.bytes, lead, frame);
        return block;
    }

    void fill(raw_block&) override {}
    void wake() noexcept override { reader_.wake(); }

private:
    std::size_t replay_or_read(std::span<std::byte> out) {
        const std::size_t replayed = std::min(out.size(), opening_.size() - replayed_);
        std::copy_n(opening_.begin() + static_cast<std::ptrdiff_t>(replayed_), replayed,
                    out.begin());
        replayed_ += replayed;
        return replayed + read(out.subspan(replayed));
    }

    bool at_limit() const noexcept {
        return limit_ && read_frames_ == *limit_ && replayed_ == opening_.size();
    }

    // Whole frames from the first to be measured on, as far as the limit; bytes read.
    std::size_t read(std::span<std::byte> out) {
        if (!skip_to_first())
            return 0;
        const std::size_t frame = facts_.frame_bytes();
        if (limit_) {
            const auto left = static_cast<std::uint64_t>(*limit_ - read_frames_);
            out = out.first(frame * static_cast<std::size_t>(
                                        std::min<std::uint64_t>(left, out.size() / frame)));
        }
        const std::size_t got = reader_.read(out);
        const std::size_t odd = got % frame;
        read_frames_ += static_cast<sample_index>(got / frame);
        if (reader_.ended()) {
            note_odd_tail(facts_.notes, static_cast<std::int64_t>(odd), frame);
            if (read_frames_ == 0)
                throw_empty();
        }
        return got - odd;
    }

    // Reads what lies before --from once; false when woken or ended meanwhile.
    bool skip_to_first() {
        const std::size_t frame = facts_.frame_bytes();
        const std::size_t most = std::max<std::size_t>(65536 / frame, 1);
        std::vector<std::byte> thrown_away;
        for (sample_index& left = to_skip_; left > 0;) {
            thrown_away.resize(frame * std::min(most, static_cast<std::size_t>(left)));
            const std::size_t got = reader_.read(thrown_away);
            left -= static_cast<sample_index>(got / frame);
            if (got < thrown_away.size()) {
                if (reader_.ended())
                    throw_empty();
                return false;
            }
        }
        return true;
    }

    [[noreturn]] void throw_empty() const {
        const sample_index first = facts_.stretches.front().first;
        if (first == 0)
            throw error{fault::malformed, "holds no samples", facts_.where(),
                        "check what writes to it"};
        throw error{fault::malformed,
                    fmt::format("ended before --from {:g} s",
                                static_cast<double>(first) / facts_.sample_rate_hz),
                    facts_.where(), "give an earlier --from"};
    }

    stream_facts facts_;
    pipe_reader reader_;
    std::optional<sample_index> limit_; // samples to be measured
    sample_index to_skip_ = facts_.stretches.front().first;
    sample_index read_frames_ = 0, handed_out_ = 0;
    std::vector<std::byte> opening_;
    std::size_t replayed_ = 0; // bytes of the opening
    frame_history history_;
    bool finished_ = false;
};

} // namespace

std::unique_ptr<block_source> make_pipe_source(stream_facts facts, int descriptor, bool owned) {
    return std::make_unique<pipe_source>(std::move(facts), descriptor, owned);
}

} // namespace tonewalk
