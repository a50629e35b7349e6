// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/channel/front_end.hpp"

#include "direct_front_end.hpp"

namespace tonewalk {

std::unique_ptr<const front_end> front_end::make(const stream_facts& facts,
                                                 std::span<const channel_plan> plans,
                                                 const std::optional<iq_balance>& mend) {
    return std::make_unique<const direct_front_end>(facts, plans,
                                                    mend ? mend->image_ratio : cf64{});
}

} // namespace tonewalk
