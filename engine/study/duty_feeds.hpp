// Which sources a device's current comes from.
#pragma once
#include "engine/study/duty.hpp"

namespace kiloamp::detail {

/// Splits `through_ka` over the sources of the solved network by superposition, positive sequence: source j
/// alone drives
///   I_total,j = y_j Z_jk          of the fault current at k, and through the own branch's terminals
///   I_own,j = -sum_q y_pq (Z_qj - Z_qk Z_jk / Z_kk) y_j Z_kk + [j at the terminal itself] y_j Z_kk.
/// A part counts with its share in phase with the whole. Largest first, at most `most`; empty when the branch
/// is a closed switch in a loop of switches (its share rests on an assumption), or has no current.
[[nodiscard]] std::vector<DutyFeed> duty_feeds(const Study& study, BusIndex bus,
                                               const std::optional<ElementRef>& branch, DutySide side,
                                               double through_ka, std::size_t most);

}  // namespace kiloamp::detail
