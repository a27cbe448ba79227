// Independent tasks on a few threads.
#pragma once
#include <functional>

namespace kiloamp::sparse {

/// Calls task(t, worker) once for each t in 0 .. count - 1, on up to `threads` threads (the caller's
/// included); `worker` < max(1, threads) tells which. Returns when all are done; rethrows the first
/// exception. Nothing is started for a single thread or a single task. Tasks must not share what they write.
void run_tasks(int count, int threads, const std::function<void(int task, int worker)>& task);

}  // namespace kiloamp::sparse
