// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/scene/generator.hpp"

#include <algorithm>
#include <utility>

#include "carrier_signal.hpp"
#include "receiver.hpp"
#include "storing.hpp"

namespace tonewalk {
namespace {

constexpr std::size_t block_samples = 1024; // its scratch stays in the nearest caches

} // namespace

struct scene_generator::state {
    explicit state(scene given)
        : whole{std::move(given)}, stretches{scene_layout(whole)}, receiver{whole}, store{whole} {
        for (std::size_t k = 0; k < whole.carriers.size(); ++k)
            carriers.emplace_back(whole, k);
    }

    /// Samples that can be made at once from here: within the stretch and a block; 0 at the end.
    std::size_t run_ahead(std::size_t wanted) {
        while (stretch < stretches.size() && done == stretches[stretch].count) {
            ++stretch;
            done = 0;
        }
        if (stretch == stretches.size())
            return 0;
        if (done == 0)
            tune();
        return std::min(
            {wanted, block_samples, static_cast<std::size_t>(stretches[stretch].count - done)});
    }

    void tune() {
        present.clear();
        for (std::size_t k = 0; k < carriers.size(); ++k) {
            const auto tuning = tuned(whole, whole.carriers[k], stretches[stretch].centre_hz);
            if (!tuning)
                continue;
            carriers[k].tune(*tuning);
            present.push_back(k);
        }
    }

    void make(std::span<cf64> out) {
        const sample_index position = stretches[stretch].position + done;
        std::fill(out.begin(), out.end(), cf64{});
        for (const std::size_t k : present)
            carriers[k].add(position, out);
        receiver.process(position, out);
        done += static_cast<sample_index>(out.size());
    }

    scene whole;
    std::vector<scene_stretch> stretches;
    std::size_t stretch = 0;
    sample_index done = 0; // of the stretch
    std::vector<carrier_signal> carriers;
    std::vector<std::size_t> present; // carriers in the band now
    receiver_chain receiver;
    sample_store store;
    std::vector<cf64> block;
};

scene_generator::scene_generator(const scene& whole) {
    check_scene(whole, "scene");
    state_ = std::make_unique<state>(whole);
}
scene_generator::scene_generator(scene_generator&&) noexcept = default;
scene_generator& scene_generator::operator=(scene_generator&&) noexcept = default;
scene_generator::~scene_generator() = default;

std::size_t scene_generator::render(std::span<cf64> out) {
    std::size_t made = 0;
    while (const std::size_t run = state_->run_ahead(out.size() - made)) {
        state_->make(out.subspan(made, run));
        made += run;
    }
    return made;
}

std::size_t scene_generator::render_bytes(std::span<std::byte> out) {
    const std::size_t sample_bytes = state_->whole.format.sample_bytes();
    const std::size_t wanted = out.size() / sample_bytes;
    std::size_t made = 0;
    while (const std::size_t run = state_->run_ahead(wanted - made)) {
        const scene_stretch& stretch = state_->stretches[state_->stretch];
        const sample_index first = stretch.first + state_->done;
        state_->block.resize(run);
        state_->make(state_->block);
        state_->store.store(first, state_->block,
                            out.subspan(made * sample_bytes, run * sample_bytes));
        made += run;
    }
    return made;
}

sample_index scene_generator::position() const {
    const std::vector<scene_stretch>& stretches = state_->stretches;
    const std::size_t here = state_->stretch;
    if (here == stretches.size())
        return stretches.back().position + stretches.back().count;
    if (state_->done == stretches[here].count && here + 1 < stretches.size())
        return stretches[here + 1].position;
    return stretches[here].position + state_->done;
}

double scene_generator::controlled_gain_db() const noexcept {
    return state_->receiver.controlled_gain_db();
}

std::vector<cf64> render_samples(const scene& whole) {
    scene_generator generator{whole};
    std::vector<cf64> samples(static_cast<std::size_t>(stored_samples(whole)));
    generator.render(samples);
    return samples;
}

std::vector<std::byte> render_bytes(const scene& whole) {
    scene_generator generator{whole};
    std::vector<std::byte> bytes(static_cast<std::size_t>(stored_samples(whole)) *
                                 whole.format.sample_bytes());
    generator.render_bytes(bytes);
    return bytes;
}

} // namespace tonewalk
