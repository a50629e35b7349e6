// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <memory>

#include "input_file.hpp"
#include "tonewalk/recording/stream.hpp"

namespace tonewalk {

/// Whether the name ends like a kind of file that libsndfile reads.
[[nodiscard]] bool named_like_container(const std::filesystem::path&);

/// Two channels (left I, right Q) or one (a real signal), in the depth in which they are stored:
/// plain ones straight from the file, coded ones through libsndfile. Throws error{malformed,
/// unsupported ...}.
[[nodiscard]] std::unique_ptr<block_source> open_container(const recording_request&, input_file);

} // namespace tonewalk
