// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <cstddef>
#include <memory>
#include <span>
#include <vector>

#include "tonewalk/base/sample.hpp"
#include "tonewalk/scene/scene.hpp"

namespace tonewalk {

/// Makes a scene's samples in order. The same scene gives the same bits on every machine and
/// however the output is cut (64-bit integer phases; sine, logarithm and Gaussian from + - x / and
/// square root).
///   shape   stored samples only; over a gap the carriers run on, the gain control waits
///   cost    about 0.1 to 0.2 us a sample for one carrier with a tone and noise; memory fixed but
///   for
///           the scene itself
class scene_generator {
public:
    explicit scene_generator(const scene&); ///< copies; throws error{malformed} (check_scene)
    scene_generator(scene_generator&&) noexcept;
    scene_generator& operator=(scene_generator&&) noexcept;
    ~scene_generator();

    /// The next samples, full scale = 1.0, as they are before they are stored (clipped, not
    /// rounded; of a real format the analytic signal's real part is what is stored). Returns how
    /// many: fewer than out.size() only at the end.
    std::size_t render(std::span<cf64> out);
    /// The next samples as stored; out.size() a multiple of the sample's bytes. Returns samples.
    /// One object serves either render or render_bytes.
    std::size_t render_bytes(std::span<std::byte> out);
    [[nodiscard]] sample_index position() const; ///< of the next sample, lost ones counted
    [[nodiscard]] double controlled_gain_db() const noexcept; ///< of the gain control, now

private:
    struct state;
    std::unique_ptr<state> state_;
};

[[nodiscard]] std::vector<cf64> render_samples(const scene&);    ///< all of it
[[nodiscard]] std::vector<std::byte> render_bytes(const scene&); ///< all of it, as stored

} // namespace tonewalk
