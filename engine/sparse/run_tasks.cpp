#include "engine/sparse/run_tasks.hpp"

#include <algorithm>
#include <atomic>
#include <exception>
#include <mutex>
#include <thread>
#include <vector>

namespace kiloamp::sparse {

void run_tasks(int count, int threads, const std::function<void(int, int)>& task) {
  std::atomic<int> next{0};
  std::exception_ptr failure;
  std::mutex failure_guard;
  const auto work = [&](int worker) {
    try {
      for (int t = next++; t < count; t = next++) task(t, worker);
    } catch (...) {
      const std::lock_guard lock(failure_guard);
      if (!failure) failure = std::current_exception();
      next = count;
    }
  };
  {
    std::vector<std::jthread> others;
    for (int worker = 1; worker < std::min(threads, count); ++worker) others.emplace_back(work, worker);
    work(0);
  }
  if (failure) std::rethrow_exception(failure);
}

}  // namespace kiloamp::sparse
