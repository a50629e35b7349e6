// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/pass/run_pass.hpp"

#include <algorithm>
#include <chrono>
#include <condition_variable>
#include <exception>
#include <memory>
#include <mutex>
#include <optional>
#include <stop_token>
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
    std::vector<std::vector<cf32>> outputs; // one a channel
    std::vector<std::size_t> sizes;         // samples of outputs in use
    std::uint64_t turn = 0;                 // number of the block, from 0
    enum class phase { free, working, ready, failed } state = phase::free;
};

class pass {
public:
    pass(block_source&, const front_end&, std::span<chain* const>, raw_watch&, const run_control&,
         const pass_tuning&);
    pass_report run();

private:
    void work(std::size_t worker);
    slot* claim(std::size_t worker, std::unique_lock<std::mutex>&);
    bool compute(slot&, workspace&);
    void commit_ready(std::unique_lock<std::mutex>&);
    void commit(slot&);
    void fail(const std::string& line);
    void tell_progress();
    [[nodiscard]] bool anyone_waits_for_a_first_block(std::size_t worker) const;

    block_source* source_;
    const front_end* front_;
    std::span<chain* const> chains_;
    raw_watch* watch_;
    run_control control_;
    std::size_t block_samples_ = 0;
    std::size_t workers_ = 1;
    std::vector<slot> ring_;
    std::vector<std::unique_ptr<workspace>> workspaces_;

    std::mutex mutex_;
    std::condition_variable changed_;
    bool claiming_ = false;       // a worker is inside source_->claim
    bool drained_ = false;        // no more blocks will be claimed
    bool committing_ = false;     // a worker is inside the chains
    std::uint64_t claimed_ = 0;   // blocks
    std::uint64_t committed_ = 0; // blocks
    std::optional<std::uint64_t> failed_turn_;
    std::vector<sample_index> stretch_outputs_; // front-end outputs so far, by stretch
    pass_report report_;
    std::chrono::steady_clock::time_point told_{};
};

pass::pass(block_source& source, const front_end& front, std::span<chain* const> chains,
           raw_watch& watch, const run_control& control, const pass_tuning& tuning)
    : source_{&source}, front_{&front}, chains_{chains}, watch_{&watch}, control_{control},
      workers_{std::clamp(control.threads, 1U, most_workers)} {
    const std::size_t frame = source.facts().frame_bytes();
    const std::size_t slots = workers_ == 1 ? 1 : workers_ + 2;
    const std::size_t room = std::min(tuning.block_bytes, most_ring_bytes / slots) / frame;
    const std::size_t after_lead = room > front.lead() ? room - front.lead() : 0;
    block_samples_ = std::max<std::size_t>(1, after_lead / front.cell()) * front.cell();
    ring_.resize(slots);
    const std::size_t most_outputs =
        block_samples_ / front.decimation() + front.delay_outputs() + 1;
    for (slot& each : ring_) {
        each.bytes.resize((block_samples_ + front.lead()) * frame);
        each.counts.cells.reserve(block_samples_ / front.cell() + 1);
        each.counts.non_finite.reserve(block_samples_ / front.cell() + 1);
        each.outputs.assign(chains.size(), std::vector<cf32>(most_outputs));
    }
    for (std::size_t k = 0; k < workers_; ++k) {
        workspaces_.push_back(front.make_workspace(block_samples_));
    }
    stretch_outputs_.assign(source.facts().stretches.size(), 0);
    report_.blocks_per_worker.assign(workers_, 0);
}

pass_report pass::run() {
    const std::stop_callback wake{control_.stop, [this] { source_->wake(); }};
    {
        std::vector<std::jthread> helpers;
        for (std::size_t k = 1; k < workers_; ++k) {
            helpers.emplace_back([this, k] { work(k); });
        }
        work(0);
    }
    for (chain* each : chains_) {
        each->finish();
    }
    if (report_.end == pass_end::complete && control_.stop.stop_requested()) {
        report_.end = pass_end::stopped;
    }
    return report_;
}

void pass::work(std::size_t worker) {
    std::unique_lock lock{mutex_};
    while (slot* mine = claim(worker, lock)) {
        lock.unlock();
        const bool good = compute(*mine, *workspaces_[worker]);
        lock.lock();
        mine->state = good ? slot::phase::ready : slot::phase::failed;
        commit_ready(lock);
    }
}

/// While blocks remain, a worker that has had none goes first.
bool pass::anyone_waits_for_a_first_block(std::size_t worker) const {
    const auto& had = report_.blocks_per_worker;
    return had[worker] > 0 && std::find(had.begin(), had.end(), std::uint64_t{0}) != had.end();
}

slot* pass::claim(std::size_t worker, std::unique_lock<std::mutex>& lock) {
    const auto find_free = [this] {
        return std::find_if(ring_.begin(), ring_.end(),
                            [](const slot& each) { return each.state == slot::phase::free; });
    };
    changed_.wait(lock, [&] {
        return drained_ || (!claiming_ && find_free() != ring_.end() &&
                            !anyone_waits_for_a_first_block(worker));
    });
    if (drained_) {
        return nullptr;
    }
    slot& mine = *find_free();
    mine.state = slot::phase::working;
    claiming_ = true;
    std::optional<raw_block> block;
    std::string failure;
    if (!control_.stop.stop_requested()) {
        lock.unlock(); // a pipe may wait here; the chains go on meanwhile
        try {
            block = source_->claim(mine.bytes, front_->lead());
        } catch (const std::exception& problem) {
            failure = problem.what();
        }
        lock.lock();
    }
    claiming_ = false;
    if (!block) {
        if (!failure.empty()) {
            fail(failure);
        }
        drained_ = true;
        mine.state = slot::phase::free;
        changed_.notify_all();
        return nullptr;
    }
    mine.block = *block;
    mine.turn = claimed_++;
    ++report_.blocks_per_worker[worker];
    changed_.notify_all();
    return &mine;
}

bool pass::compute(slot& mine, workspace& space) {
    try {
        source_->fill(mine.block);
    } catch (const std::exception& problem) {
        const std::lock_guard lock{mutex_};
        fail(problem.what());
        failed_turn_ = std::min(failed_turn_.value_or(mine.turn), mine.turn);
        drained_ = true;
        changed_.notify_all();
        return false;
    }
    std::vector<std::span<cf32>> out;
    for (std::vector<cf32>& channel : mine.outputs) {
        out.push_back(std::span{channel}.first(front_->outputs(mine.block)));
    }
    front_->process(mine.block, space, mine.counts, out);
    return true;
}

void pass::fail(const std::string& line) {
    if (report_.end != pass_end::input_failed) {
        report_.end = pass_end::input_failed;
        report_.failure = line;
    }
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
            return each.turn == committed_ &&
                   (each.state == slot::phase::ready || each.state == slot::phase::failed);
        });
        if (next == ring_.end()) {
            break;
        }
        const bool lost = failed_turn_ && next->turn >= *failed_turn_;
        lock.unlock();
        if (!lost) {
            commit(*next);
        }
        lock.lock();
        next->state = slot::phase::free;
        ++committed_;
        changed_.notify_all();
    }
    committing_ = false;
}

void pass::commit(slot& done) {
    const raw_block& block = done.block;
    watch_->add(done.counts, block.count);
    sample_index& outputs = stretch_outputs_[block.stretch];
    const std::size_t count = front_->outputs(block);
    for (std::size_t k = 0; k < chains_.size(); ++k) {
        chains_[k]->add({.iq = std::span<const cf32>{done.outputs[k]}.first(count),
                         .first_output = outputs,
                         .samples = static_cast<sample_index>(block.count),
                         .stretch = block.stretch,
                         .ends_stretch = block.ends_stretch,
                         .held = front_->holds(k, block.stretch),
                         .non_finite = done.counts.non_finite});
    }
    outputs += static_cast<sample_index>(count);
    report_.samples += static_cast<sample_index>(block.count);
    tell_progress();
}

void pass::tell_progress() {
    constexpr std::chrono::milliseconds spacing{100};
    const auto now = std::chrono::steady_clock::now();
    if (control_.progress != nullptr && now - told_ >= spacing) {
        told_ = now;
        control_.progress->advance(report_.samples, source_->facts().samples());
    }
}

} // namespace

pass_report run_pass(block_source& source, const front_end& front, std::span<chain* const> chains,
                     raw_watch& watch, const run_control& control, const pass_tuning& tuning) {
    return pass{source, front, chains, watch, control, tuning}.run();
}

} // namespace tonewalk
