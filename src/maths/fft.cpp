// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/maths/fft.hpp"

#include <complex> // before fftw3.h, so that fftwf_complex is std::complex<float>

#include <fftw3.h>

#include <array>
#include <cassert>
#include <new>

namespace tonewalk {
namespace {

struct fftw_memory {
    void operator()(cf32* p) const noexcept { fftwf_free(p); }
};
using fftw_buffer = std::unique_ptr<cf32[], fftw_memory>;

struct plan_ending {
    void operator()(fftwf_plan plan) const noexcept { fftwf_destroy_plan(plan); }
};
using fftw_plan_handle = std::unique_ptr<std::remove_pointer_t<fftwf_plan>, plan_ending>;

fftw_buffer make_buffer(std::size_t size) {
    auto* memory = static_cast<cf32*>(fftwf_malloc(size * sizeof(cf32)));
    if (memory == nullptr) {
        throw std::bad_alloc{};
    }
    std::uninitialized_fill_n(memory, size, cf32{});
    return fftw_buffer{memory};
}

/// FFTW's planner is not thread-safe until told once to be.
void make_planner_safe() {
    static const bool once = [] {
        fftwf_make_planner_thread_safe();
        return true;
    }();
    static_cast<void>(once);
}

fftwf_complex* as_fftw(cf32* p) noexcept {
    return reinterpret_cast<fftwf_complex*>(p);
}

} // namespace

struct fft::state {
    std::size_t size;
    fftw_buffer in, out;
    fftw_plan_handle plan;
};

fft::fft(std::size_t size, direction way) {
    assert(size > 0);
    make_planner_safe();
    state_ = std::make_unique<state>(state{size, make_buffer(size), make_buffer(size), nullptr});
    state_->plan.reset(fftwf_plan_dft_1d(static_cast<int>(size), as_fftw(state_->in.get()),
                                         as_fftw(state_->out.get()),
                                         way == direction::forward ? FFTW_FORWARD : FFTW_BACKWARD,
                                         FFTW_ESTIMATE | FFTW_PRESERVE_INPUT));
    if (!state_->plan) {
        throw std::bad_alloc{};
    }
}

fft::fft(fft&&) noexcept = default;
fft& fft::operator=(fft&&) noexcept = default;
fft::~fft() = default;

std::size_t fft::size() const noexcept {
    return state_->size;
}
std::span<cf32> fft::input() noexcept {
    return {state_->in.get(), state_->size};
}
std::span<const cf32> fft::output() const noexcept {
    return {state_->out.get(), state_->size};
}
void fft::run() noexcept {
    fftwf_execute(state_->plan.get());
}

std::size_t fast_fft_size(std::size_t n) noexcept {
    constexpr std::array<std::size_t, 4> primes{2, 3, 5, 7};
    for (std::size_t size = n > 0 ? n : 1;; ++size) {
        std::size_t rest = size;
        for (const std::size_t prime : primes) {
            while (rest % prime == 0) {
                rest /= prime;
            }
        }
        if (rest == 1) {
            return size;
        }
    }
}

} // namespace tonewalk
