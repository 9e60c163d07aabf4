// SPDX-License-Identifier: GPL-3.0-or-later
// Work over the cores whose results are used one after another, as if it had been done in a loop.
#pragma once

#include <algorithm>
#include <condition_variable>
#include <cstddef>
#include <exception>
#include <mutex>
#include <optional>
#include <thread>
#include <utility>
#include <vector>

namespace kneeprint {

/// One thread per core that this process may use, and at least two: while one waits for the disk,
/// the other computes.
inline std::size_t workers_for(std::size_t count) {
  const std::size_t cores = std::thread::hardware_concurrency();
  return std::min(count, std::max<std::size_t>(2, cores));
}

/// Calls make(0) .. make(count - 1) on `workers` threads (at least 1), at most two results per
/// worker ahead of use, and use(result) for each in this order on the calling thread. What either
/// throws is thrown here once every thread has ended; of several makes that throw, the first in
/// order, after the results before it were used. make: called from several threads at once.
template <class Make, class Use>
void in_order(std::size_t count, std::size_t workers, Make make, Use use) {
  using Result = decltype(make(std::size_t{}));
  struct Slot {
    std::optional<Result> result;
    std::exception_ptr failure;
    bool done = false;
  };
  const std::size_t ahead = 2 * workers;
  std::vector<Slot> slots(ahead);  // of index i: i % ahead
  std::mutex mutex;
  std::condition_variable made, used;
  std::size_t next = 0, consumed = 0;
  bool stop = false;

  const auto work = [&] {
    for (std::unique_lock lock(mutex);;) {
      used.wait(lock, [&] { return stop || next >= count || next < consumed + ahead; });
      if (stop || next >= count) return;
      const std::size_t mine = next++;
      lock.unlock();
      Slot slot;
      try {
        slot.result.emplace(make(mine));
      } catch (...) {
        slot.failure = std::current_exception();
      }
      slot.done = true;
      lock.lock();
      slots[mine % ahead] = std::move(slot);
      made.notify_one();
    }
  };
  std::vector<std::jthread> threads;
  // Whatever ends this function wakes the workers first and joins them then.
  struct Ender {
    std::mutex& mutex;
    std::condition_variable& used;
    bool& stop;
    std::vector<std::jthread>& threads;
    ~Ender() {
      {
        const std::scoped_lock lock(mutex);
        stop = true;
      }
      used.notify_all();
      threads.clear();
    }
  } ender{mutex, used, stop, threads};
  for (std::size_t w = 0; w < workers; ++w) threads.emplace_back(work);

  for (std::size_t i = 0; i < count; ++i) {
    Slot slot;
    {
      std::unique_lock lock(mutex);
      made.wait(lock, [&] { return slots[i % ahead].done; });
      slot = std::exchange(slots[i % ahead], Slot{});
      consumed = i + 1;
    }
    used.notify_one();
    if (slot.failure) std::rethrow_exception(slot.failure);
    use(std::move(*slot.result));
  }
}

}  // namespace kneeprint
