// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <span>

namespace tonewalk {

/// Anything that takes mono audio, in order.
class audio_sink {
public:
    virtual ~audio_sink() = default;
    virtual void add(std::span<const float>) = 0;
};

} // namespace tonewalk
