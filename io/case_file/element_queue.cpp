#include "io/case_file/element_queue.hpp"

#include <utility>

namespace kiloamp::case_file {

ElementQueue::ElementQueue(ElementReader& reader) : reader_(reader), thread_([this] { read(); }) {}

ElementQueue::~ElementQueue() {
  {
    const std::lock_guard lock(mutex_);
    ended_ = true;
  }
  changed_.notify_all();
  if (thread_.joinable()) thread_.join();
}

Values& ElementQueue::next() {
  Batch& batch = batches_[filling_ % kBatches];
  return batch.values[batch.used];
}

void ElementQueue::push(ElementKind kind) {
  Batch& batch = batches_[filling_ % kBatches];
  batch.kinds[batch.used++] = kind;
  if (batch.used == kElements) hand_over();
}

void ElementQueue::hand_over() {
  std::unique_lock lock(mutex_);
  handed_over_ = ++filling_;
  changed_.notify_all();
  changed_.wait(lock, [this] { return filling_ - read_ < kBatches; });
  batches_[filling_ % kBatches].used = 0;
}

void ElementQueue::finish() {
  hand_over();
  {
    const std::lock_guard lock(mutex_);
    ended_ = true;
  }
  changed_.notify_all();
  thread_.join();
  if (failure_) std::rethrow_exception(std::exchange(failure_, nullptr));
}

void ElementQueue::read() {
  for (std::size_t b = 0;; ++b) {
    {
      std::unique_lock lock(mutex_);
      changed_.wait(lock, [&] { return handed_over_ > b || ended_; });
      if (handed_over_ <= b) return;
    }
    const Batch& batch = batches_[b % kBatches];
    try {
      for (std::size_t e = 0; e < batch.used && !failure_; ++e) reader_.read(batch.kinds[e], batch.values[e]);
    } catch (...) {
      failure_ = std::current_exception();
    }
    {
      const std::lock_guard lock(mutex_);
      read_ = b + 1;
    }
    changed_.notify_all();
  }
}

}  // namespace kiloamp::case_file
