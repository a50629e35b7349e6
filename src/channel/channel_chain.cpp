// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/channel/channel_chain.hpp"

#include <algorithm>
#include <cmath>

#include "decimator.hpp"
#include "filter_shape.hpp"
#include "tonewalk/maths/fir.hpp"

namespace tonewalk {
namespace {

constexpr double final_rate_in_widths = 4.0; // at least, where the input allows
constexpr double middle_rate_in_widths = 8.0;
constexpr std::size_t most_samples_a_call = 4096;

std::size_t whole_steps(double rate_hz, double least_rate_hz) {
    return static_cast<std::size_t>(std::max(1.0, std::floor(rate_hz / least_rate_hz)));
}

decimator middle_step(double rate_hz, double width_hz) {
    const std::size_t steps = whole_steps(rate_hz, middle_rate_in_widths * width_hz);
    if (steps == 1) {
        return {{1.0}, rate_hz, 1};
    }
    return {design_low_pass(
                {.rate_hz = rate_hz,
                 .pass_edge_hz = width_hz / 2.0,
                 .stop_edge_hz = rate_hz / static_cast<double>(steps) - stop_in_widths * width_hz,
                 .attenuation_db = 105.0}),
            rate_hz, steps};
}

/// The channel filter; nothing to filter where the flat width fills the band.
decimator channel_step(double rate_hz, double width_hz) {
    const std::size_t steps = whole_steps(rate_hz, final_rate_in_widths * width_hz);
    const double stop_hz = std::min(stop_in_widths * width_hz, rate_hz / 2.0);
    if (stop_hz < 1.02 * width_hz / 2.0) {
        return {{1.0}, rate_hz, 1};
    }
    return {design_low_pass(
                {.rate_hz = rate_hz, .pass_edge_hz = width_hz / 2.0, .stop_edge_hz = stop_hz}),
            rate_hz, steps};
}

} // namespace

struct channel_chain::state {
    state(const front_end& source, std::size_t which, const channel_plan& plan,
          const stream_facts& f)
        : front{&source}, channel{which}, facts{&f}, middle{middle_step(source.output_rate_hz(),
                                                                        plan.width_hz)},
          last{channel_step(middle.output_rate_hz(), plan.width_hz)},
          decimation{source.decimation() * middle.decimation() * last.decimation()},
          reach_input_samples{source.decimation() * (source.delay_outputs() + middle.half_taps() +
                                                     middle.decimation() * last.half_taps())} {}

    void begin(const channel_block&);
    void remember_non_finite(const channel_block&);
    [[nodiscard]] sample_index begun() const noexcept; // baseband samples of the stretch so far
    void deliver();
    void end();

    const front_end* front;
    std::size_t channel;
    const stream_facts* facts;
    decimator middle, last;
    std::size_t decimation;          // input samples a baseband sample
    std::size_t reach_input_samples; // half of every filter together
    std::vector<baseband_sink*> sinks;

    bool open = false; // inside a stretch
    baseband_stretch stretch;
    sample_index stored_first = 0;  // of the stretch
    sample_index input_samples = 0; // of the stretch, so far
    sample_index ready_first = 0;   // baseband index of ready[0]
    std::vector<cf32> middle_out, ready;
    std::vector<sample_range> non_finite; // baseband indices, ascending
};

channel_chain::channel_chain(const front_end& front, std::size_t channel, const channel_plan& plan,
                             const stream_facts& facts)
    : state_{std::make_unique<state>(front, channel, plan, facts)} {}
channel_chain::~channel_chain() = default;

void channel_chain::listen(baseband_sink& sink) {
    state_->sinks.push_back(&sink);
}

void channel_chain::state::begin(const channel_block& block) {
    const stretch_facts& about = facts->stretches[block.stretch];
    open = true;
    stored_first = about.first;
    input_samples = 0;
    non_finite.clear();
    ready.clear();
    ready_first = 0;
    stretch = {.index = block.stretch,
               .start_s = static_cast<double>(about.position) / facts->sample_rate_hz,
               .held = block.held};
    if (stretch.held) {
        ready_first = last.begin(middle.begin(-static_cast<sample_index>(front->delay_outputs())));
    }
    for (baseband_sink* sink : sinks) {
        sink->begin_stretch(stretch);
    }
}

/// Stored input indices to the baseband samples whose filters reach them.
void channel_chain::state::remember_non_finite(const channel_block& block) {
    const auto step = static_cast<sample_index>(decimation);
    const auto reach = static_cast<sample_index>(reach_input_samples);
    for (const sample_range& bad : block.non_finite) {
        const sample_index begins = bad.first - stored_first - reach;
        const sample_index ends = bad.first + bad.count - stored_first + reach; // one past
        const sample_index first =
            std::max<sample_index>(0, begins <= 0 ? 0 : (begins + step - 1) / step);
        const sample_index past = (ends + step - 1) / step;
        if (!non_finite.empty() && first <= non_finite.back().first + non_finite.back().count) {
            non_finite.back().count =
                std::max(non_finite.back().count, past - non_finite.back().first);
        } else {
            non_finite.push_back({first, past - first});
        }
    }
}

sample_index channel_chain::state::begun() const noexcept {
    const auto step = static_cast<sample_index>(decimation);
    return (input_samples + step - 1) / step;
}

/// Hands on what is ready, from baseband sample 0 to the last that the stretch has begun.
void channel_chain::state::deliver() {
    const sample_index up_to = begun();
    std::size_t place = ready_first < 0 ? static_cast<std::size_t>(-ready_first) : 0;
    while (place < ready.size() && ready_first + static_cast<sample_index>(place) < up_to) {
        const sample_index first = ready_first + static_cast<sample_index>(place);
        const auto room = static_cast<std::size_t>(up_to - first);
        const std::size_t count = std::min({ready.size() - place, room, most_samples_a_call});
        const auto past =
            std::find_if(non_finite.begin(), non_finite.end(),
                         [first](const sample_range& r) { return r.first + r.count > first; });
        non_finite.erase(non_finite.begin(), past);
        const baseband_block block{std::span<const cf32>{ready}.subspan(place, count), first,
                                   non_finite};
        for (baseband_sink* sink : sinks) {
            sink->add(block);
        }
        place += count;
    }
    const std::size_t gone = std::min(place, ready.size());
    ready.erase(ready.begin(), ready.begin() + static_cast<std::ptrdiff_t>(gone));
    ready_first += static_cast<sample_index>(gone);
}

void channel_chain::state::end() {
    if (stretch.held) {
        middle_out.clear();
        middle.end(middle_out);
        last.add(middle_out, ready);
        last.end(ready);
        deliver();
    }
    for (baseband_sink* sink : sinks) {
        sink->end_stretch();
    }
    open = false;
}

void channel_chain::add(const channel_block& block) {
    state& s = *state_;
    if (!s.open) {
        s.begin(block);
    }
    s.input_samples += block.samples;
    if (s.stretch.held) {
        s.remember_non_finite(block);
        s.middle_out.clear();
        s.middle.add(block.iq, s.middle_out);
        s.last.add(s.middle_out, s.ready);
    } else {
        s.ready.assign(static_cast<std::size_t>(s.begun() - s.ready_first), cf32{});
    }
    s.deliver();
    if (block.ends_stretch) {
        s.end();
    }
}

void channel_chain::finish() {
    if (state_->open) {
        state_->end();
    }
    for (baseband_sink* sink : state_->sinks) {
        sink->finish();
    }
}

double channel_chain::rate_hz() const noexcept {
    return state_->last.output_rate_hz();
}
std::size_t channel_chain::decimation() const noexcept {
    return state_->decimation;
}

std::size_t channel_chain::settle_samples() const noexcept {
    return (state_->reach_input_samples + state_->decimation - 1) / state_->decimation;
}

double channel_chain::response(double hz) const noexcept {
    return state_->front->response(state_->channel, hz) * state_->middle.response(hz) *
           state_->last.response(hz);
}

double channel_chain::noise_bandwidth_hz() const noexcept {
    // |response|^2 is a cosine sum of at most 2 x settle_samples() terms (what the decimation folds
    // in lies 100 dB down): a plain sum over more points than that is its integral.
    const std::size_t points = 4 * settle_samples() + 4;
    const double step_hz = rate_hz() / static_cast<double>(points);
    double sum = 0.0;
    for (std::size_t k = 0; k < points; ++k) {
        const double gain = response(step_hz * static_cast<double>(k) - rate_hz() / 2.0);
        sum += gain * gain;
    }
    return sum * step_hz;
}

} // namespace tonewalk
