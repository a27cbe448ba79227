// Elements on their way from the thread that parses the text to the one that binds them to the network.
#pragma once
#include <array>
#include <condition_variable>
#include <exception>
#include <mutex>
#include <thread>

#include "io/case_file/element_reader.hpp"

namespace kiloamp::case_file {

/// Reads elements on a thread of its own, in the order in which they were pushed: parsing and binding cost
/// about the same. Three batches go round, so that memory is that of some hundred elements.
class ElementQueue {
 public:
  explicit ElementQueue(ElementReader& reader);
  ~ElementQueue();
  ElementQueue(const ElementQueue&) = delete;
  ElementQueue& operator=(const ElementQueue&) = delete;

  /// Where the next element is to be collected; it is dropped unless push() follows.
  [[nodiscard]] Values& next();
  void push(ElementKind kind);
  /// After the last element: returns when all are read. Rethrows what the reader threw.
  void finish();

 private:
  static constexpr std::size_t kElements = 256, kBatches = 3;
  struct Batch {
    std::array<Values, kElements> values;
    std::array<ElementKind, kElements> kinds{};
    std::size_t used = 0;
  };

  void hand_over();
  void read();

  ElementReader& reader_;
  std::array<Batch, kBatches> batches_;
  std::size_t filling_ = 0;  // number of the batch that is being filled; batch b stands at b % kBatches
  std::mutex mutex_;
  std::condition_variable changed_;
  std::size_t handed_over_ = 0, read_ = 0;  // batches
  bool ended_ = false;
  std::exception_ptr failure_;
  std::thread thread_;
};

}  // namespace kiloamp::case_file
