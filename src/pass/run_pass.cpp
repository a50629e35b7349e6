// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/pass/run_pass.hpp"

#include <algorithm>
#include <chrono>
#include <condition_variable>
#include <exception>
#include <limits>
#include <memory>
#include <mutex>
#include <optional>
#include <stop_token>
#include <system_error>
#include <thread>

namespace tonewalk {
namespace {

constexpr std::size_t most_ring_bytes = std::size_t{8} * 1024 * 1024;
constexpr unsigned most_workers = 16;

/// One place of the ring: a block on its way from the source to the chains.
struct slot {
    std::vector<std::byte> bytes;
    raw_block block;
    raw_counts counts;
    std::vector<std::vector<cf32>> outputs; // room, one a channel
    std::vector<std::span<cf32>> filtered;  // what of it this block fills
    std::uint64_t turn = 0;                 // number of the block, from 0
    enum class phase { free, working, ready } state = phase::free;
};

/// What comes after the last block that reached the chains, and the bytes before it: a stretch that
/// a stop or a failure cuts off is ended with an empty block, as if the recording ended there.
struct open_end {
    raw_block next;
    std::vector<std::byte> lead;
    bool ends_stretch = true;
};

class pass {
public:
    pass(block_source&, const front_end&, std::span<chain* const>, raw_watch&, const run_control&,
         const pass_tuning&);
    pass_report run();

private:
    void work(std::size_t worker) noexcept;
    void start_helpers(std::vector<std::jthread>&);
    slot* claim(std::size_t worker, std::unique_lock<std::mutex>&);
    bool claim_into(slot&, std::unique_lock<std::mutex>&);
    void compute(slot&, workspace&);
    void filter(slot&, workspace&) const;
    void commit_ready(std::unique_lock<std::mutex>&);
    void commit(slot&);
    void remember_end(const raw_block&);
    void end_cut_stretch();
    void fail(std::uint64_t turn, const std::string& line);
    void give_up(std::exception_ptr) noexcept;
    void tell_progress();
    [[nodiscard]] slot* free_slot() noexcept;
    [[nodiscard]] bool others_wait_for_a_first_block(std::size_t worker) const noexcept;
    [[nodiscard]] bool saw_the_end() const noexcept;

    block_source* source_;
    const front_end* front_;
    std::span<chain* const> chains_;
    raw_watch* watch_;
    run_control control_;
    std::size_t frame_bytes_;
    std::size_t stretches_;
    std::optional<sample_index> all_samples_;
    std::vector<slot> ring_;
    std::vector<std::unique_ptr<workspace>> workspaces_; // one a worker

    std::mutex mutex_; // guards what follows; the chains and the source are called without it
    std::condition_variable changed_;
    bool claiming_ = false;     // a worker is inside source_->claim
    bool drained_ = false;      // no more blocks will be claimed
    bool committing_ = false;   // a worker is inside the chains
    std::uint64_t claimed_ = 0; // blocks
    std::uint64_t failed_turn_ = std::numeric_limits<std::uint64_t>::max();
    std::exception_ptr thrown_; // a fault, or what a meter threw
    pass_report report_;

    std::uint64_t committed_ = 0; // blocks; from here on: of the committing worker
    open_end end_;
    std::chrono::steady_clock::time_point told_{};
};

pass::pass(block_source& source, const front_end& front, std::span<chain* const> chains,
           raw_watch& watch, const run_control& control, const pass_tuning& tuning)
    : source_{&source}, front_{&front}, chains_{chains}, watch_{&watch}, control_{control},
      frame_bytes_{source.facts().frame_bytes()}, stretches_{source.facts().stretches.size()},
      all_samples_{source.facts().samples()} {
    const std::size_t workers = std::clamp(control.threads, 1U, most_workers);
    const std::size_t slots = workers == 1 ? 1 : workers + 2;
    const std::size_t room = std::min(tuning.block_bytes, most_ring_bytes / slots) / frame_bytes_;
    const std::size_t after_lead = room > front.lead() ? room - front.lead() : 0;
    const std::size_t cells = std::max<std::size_t>(1, after_lead / front.cell());
    const std::size_t block_samples = cells * front.cell();
    ring_.resize(slots);
    for (slot& each : ring_) {
        each.bytes.resize((front.lead() + block_samples) * frame_bytes_);
        each.counts.cells.reserve(cells);
        each.counts.non_finite.reserve(cells);
        each.outputs.assign(chains.size(), std::vector<cf32>(block_samples / front.decimation() +
                                                             front.delay_outputs()));
    }
    for (std::size_t k = 0; k < workers; ++k) {
        workspaces_.push_back(front.make_workspace(block_samples));
    }
    report_.blocks_per_worker.assign(workers, 0);
}

pass_report pass::run() {
    const std::stop_callback wake{control_.stop, [this] { source_->wake(); }};
    {
        std::vector<std::jthread> helpers;
        start_helpers(helpers);
        work(0);
    }
    if (thrown_) {
        std::rethrow_exception(thrown_);
    }
    if (report_.end == pass_end::complete && control_.stop.stop_requested() && !saw_the_end()) {
        report_.end = pass_end::stopped;
    }
    end_cut_stretch();
    for (chain* each : chains_) {
        each->finish();
    }
    return report_;
}

/// As many as the system gives: fewer only take longer.
void pass::start_helpers(std::vector<std::jthread>& helpers) {
    helpers.reserve(workspaces_.size() - 1);
    try {
        for (std::size_t k = 1; k < workspaces_.size(); ++k) {
            helpers.emplace_back([this, k] { work(k); });
        }
    } catch (const std::system_error&) {
        const std::lock_guard lock{mutex_};
        report_.blocks_per_worker.resize(helpers.size() + 1);
        changed_.notify_all();
    }
}

void pass::work(std::size_t worker) noexcept {
    try {
        std::unique_lock lock{mutex_};
        while (slot* const mine = claim(worker, lock)) {
            lock.unlock();
            compute(*mine, *workspaces_[worker]);
            lock.lock();
            mine->state = slot::phase::ready;
            commit_ready(lock);
        }
    } catch (...) {
        give_up(std::current_exception());
    }
}

slot* pass::free_slot() noexcept {
    const auto found = std::find_if(ring_.begin(), ring_.end(), [](const slot& each) {
        return each.state == slot::phase::free;
    });
    return found == ring_.end() ? nullptr : &*found;
}

/// While blocks remain, a worker that has had none goes first.
bool pass::others_wait_for_a_first_block(std::size_t worker) const noexcept {
    const auto& had = report_.blocks_per_worker;
    return had[worker] > 0 && std::find(had.begin(), had.end(), std::uint64_t{0}) != had.end();
}

/// The next block for this worker, or null when there is none left.
slot* pass::claim(std::size_t worker, std::unique_lock<std::mutex>& lock) {
    changed_.wait(lock, [&] {
        return drained_ ||
               (!claiming_ && free_slot() != nullptr && !others_wait_for_a_first_block(worker));
    });
    if (drained_) {
        return nullptr;
    }
    slot& mine = *free_slot();
    mine.state = slot::phase::working;
    claiming_ = true;
    const bool got_one = claim_into(mine, lock);
    claiming_ = false;
    if (got_one) {
        mine.turn = claimed_++;
        ++report_.blocks_per_worker[worker];
    } else {
        mine.state = slot::phase::free;
        drained_ = true;
    }
    changed_.notify_all();
    return got_one ? &mine : nullptr;
}

/// Asks the source without the lock: a pipe may wait here while the chains go on.
bool pass::claim_into(slot& mine, std::unique_lock<std::mutex>& lock) {
    if (control_.stop.stop_requested()) {
        return false;
    }
    std::optional<raw_block> block;
    std::optional<std::string> failure;
    lock.unlock();
    try {
        block = source_->claim(mine.bytes, front_->lead());
    } catch (const std::exception& problem) {
        failure = problem.what();
    }
    lock.lock();
    if (failure) {
        fail(claimed_, *failure);
    } else if (block) {
        mine.block = *block;
    }
    return block.has_value();
}

void pass::compute(slot& mine, workspace& space) {
    try {
        source_->fill(mine.block);
    } catch (const std::exception& problem) {
        const std::lock_guard lock{mutex_};
        fail(mine.turn, problem.what());
        return;
    }
    filter(mine, space);
}

void pass::filter(slot& mine, workspace& space) const {
    const std::size_t count = front_->outputs(mine.block);
    mine.filtered.clear();
    for (std::vector<cf32>& channel : mine.outputs) {
        mine.filtered.push_back(std::span{channel}.first(count));
    }
    front_->process(mine.block, space, mine.counts, mine.filtered);
}

/// Blocks from `turn` on are lost; what was claimed before them still reaches the chains.
void pass::fail(std::uint64_t turn, const std::string& line) {
    if (turn < failed_turn_) {
        failed_turn_ = turn;
        report_.end = pass_end::input_failed;
        report_.failure = line;
    }
    drained_ = true;
    changed_.notify_all();
}

/// Nothing more is claimed or committed; run() throws what the first worker met.
void pass::give_up(std::exception_ptr problem) noexcept {
    source_->wake();
    const std::lock_guard lock{mutex_};
    if (!thrown_) {
        thrown_ = std::move(problem);
    }
    drained_ = true;
    changed_.notify_all();
}

/// Whoever finishes the next block in order takes it, and all that are ready behind it, to the
/// chains.
void pass::commit_ready(std::unique_lock<std::mutex>& lock) {
    if (committing_) {
        return;
    }
    committing_ = true;
    for (;;) {
        const auto next = std::find_if(ring_.begin(), ring_.end(), [this](const slot& each) {
            return each.state == slot::phase::ready && each.turn == committed_;
        });
        if (next == ring_.end()) {
            break;
        }
        if (next->turn < failed_turn_) {
            lock.unlock();
            commit(*next);
            lock.lock();
        }
        next->state = slot::phase::free;
        ++committed_;
        changed_.notify_all();
    }
    committing_ = false;
}

void pass::commit(slot& done) {
    const raw_block& block = done.block;
    watch_->add(done.counts, block.count);
    for (std::size_t k = 0; k < chains_.size(); ++k) {
        chains_[k]->add({.iq = done.filtered[k],
                         .samples = static_cast<sample_index>(block.count),
                         .stretch = block.stretch,
                         .ends_stretch = block.ends_stretch,
                         .held = front_->holds(k, block.stretch),
                         .non_finite = done.counts.non_finite});
    }
    report_.samples += static_cast<sample_index>(block.count);
    remember_end(block);
    tell_progress();
}

void pass::remember_end(const raw_block& block) {
    const std::size_t lead = std::min(front_->lead(), block.lead + block.count);
    const auto bytes = block.bytes.last(lead * frame_bytes_);
    end_.lead.assign(bytes.begin(), bytes.end());
    end_.next.first = block.first + static_cast<sample_index>(block.count);
    end_.next.lead = lead;
    end_.next.stretch = block.stretch;
    end_.next.ends_stretch = true;
    end_.ends_stretch = block.ends_stretch;
}

void pass::end_cut_stretch() {
    if (end_.ends_stretch) {
        return;
    }
    slot& last = ring_.front();
    last.block = end_.next;
    last.block.bytes = std::span{last.bytes}.first(end_.lead.size());
    std::copy(end_.lead.begin(), end_.lead.end(), last.bytes.begin());
    filter(last, *workspaces_.front());
    commit(last);
}

bool pass::saw_the_end() const noexcept {
    return committed_ > 0 && end_.ends_stretch && end_.next.stretch + 1 == stretches_;
}

void pass::tell_progress() {
    constexpr std::chrono::milliseconds spacing{100};
    const auto now = std::chrono::steady_clock::now();
    if (control_.progress != nullptr && now - told_ >= spacing) {
        told_ = now;
        control_.progress->advance(report_.samples, all_samples_);
    }
}

} // namespace

pass_report run_pass(block_source& source, const front_end& front, std::span<chain* const> chains,
                     raw_watch& watch, const run_control& control, const pass_tuning& tuning) {
    return pass{source, front, chains, watch, control, tuning}.run();
}

} // namespace tonewalk
