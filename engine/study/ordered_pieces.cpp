#include "engine/study/ordered_pieces.hpp"

#include <algorithm>
#include <atomic>
#include <condition_variable>
#include <exception>
#include <mutex>
#include <thread>
#include <vector>

namespace kiloamp {

void in_ordered_pieces(std::size_t items, std::size_t piece, int threads,
                       const std::function<void(int thread, std::size_t first, std::size_t last)>& work,
                       const std::function<void(int thread)>& take) {
  const std::size_t pieces = (items + piece - 1) / piece;
  std::atomic<std::size_t> next{0};
  std::mutex mutex;
  std::condition_variable taken;
  std::size_t turn = 0;  // the piece to be taken next
  std::exception_ptr failure;
  const auto run = [&](int thread) {
    try {
      for (std::size_t p = next++; p < pieces; p = next++) {
        work(thread, p * piece, std::min(items, (p + 1) * piece));
        std::unique_lock lock(mutex);
        taken.wait(lock, [&] { return turn == p || failure; });
        if (failure) return;
        take(thread);
        ++turn;
        taken.notify_all();
      }
    } catch (...) {
      const std::lock_guard lock(mutex);
      if (!failure) failure = std::current_exception();
      taken.notify_all();
    }
  };
  const auto useful = static_cast<int>(std::min<std::size_t>(static_cast<std::size_t>(std::max(1, threads)),
                                                             std::max<std::size_t>(1, pieces)));
  std::vector<std::thread> others;
  for (int t = 1; t < useful; ++t) others.emplace_back(run, t);
  run(0);
  for (auto& other : others) other.join();
  if (failure) std::rethrow_exception(failure);
}

}  // namespace kiloamp
