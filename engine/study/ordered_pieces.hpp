// A long row of items worked on by several threads, its results taken in the order of the row.
#pragma once
#include <cstddef>
#include <functional>

namespace kiloamp {

/// Cuts [0, items) into pieces of `piece` items. A thread calls work(thread, first, last) for a piece of its
/// own, waits until every earlier piece was taken, and calls take(thread): what `take` sees, in which order,
/// does not depend on the number of threads. At most `threads` pieces exist at a time. The first exception
/// ends the row and reaches the caller.
void in_ordered_pieces(std::size_t items, std::size_t piece, int threads,
                       const std::function<void(int thread, std::size_t first, std::size_t last)>& work,
                       const std::function<void(int thread)>& take);

}  // namespace kiloamp
