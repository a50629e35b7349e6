// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include "tonewalk/base/sheet.hpp"
#include "tonewalk/recording/stream.hpp"

namespace tonewalk {

/// How the measured part of a recording is laid out in time: the lists "segments" (first_sample,
/// samples, time_s, duration_s, centre_hz, start_utc) and "gaps" between them (time_s, duration_s,
/// samples). `measured` is the number of samples of a pipe, whose length nobody knew before.
[[nodiscard]] sheet describe_segments(const stream_facts&, sample_index measured);

} // namespace tonewalk
