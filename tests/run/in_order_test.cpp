// SPDX-License-Identifier: GPL-3.0-or-later
#include "run/in_order.h"

#include <doctest/doctest.h>

#include <atomic>
#include <memory>
#include <stdexcept>
#include <string>
#include <vector>

namespace kneeprint {

TEST_CASE("results are used in their order, whoever is ready first") {
  for (const std::size_t workers : {1, 2, 7}) {
    CAPTURE(workers);
    std::vector<std::size_t> seen;
    // The even ones have far more to do.
    const auto make = [](std::size_t i) {
      std::size_t sum = 0;
      for (std::size_t k = 0; k < (i % 2 == 0 ? 200000u : 1u); ++k) sum += k % 3;
      return std::make_unique<std::size_t>(sum == 1 ? 0 : i);  // moved, never copied
    };
    in_order(100, workers, make, [&](std::unique_ptr<std::size_t> i) { seen.push_back(*i); });
    REQUIRE(seen.size() == 100);
    for (std::size_t i = 0; i < seen.size(); ++i) CHECK(seen[i] == i);
  }
}

TEST_CASE("nothing to do is done at once") {
  bool called = false;
  in_order(
      0, 3, [](std::size_t i) { return i; }, [&](std::size_t) { called = true; });
  CHECK_FALSE(called);
  CHECK(workers_for(0) == 0);
  CHECK(workers_for(1) == 1);
  CHECK(workers_for(100) >= 2);
}

TEST_CASE("no more than two results per worker are ahead of their use") {
  constexpr std::size_t kWorkers = 3;
  std::atomic<int> alive{0}, most{0};
  struct Counted {
    std::atomic<int>* alive;
    explicit Counted(std::atomic<int>* a) : alive(a) {}
    Counted(Counted&& other) noexcept : alive(std::exchange(other.alive, nullptr)) {}
    Counted& operator=(Counted&& other) noexcept {
      std::swap(alive, other.alive);
      return *this;
    }
    ~Counted() {
      if (alive != nullptr) --*alive;
    }
  };
  const auto make = [&](std::size_t) {
    const int now = ++alive;
    int seen = most;
    while (now > seen && !most.compare_exchange_weak(seen, now)) {
    }
    return Counted(&alive);
  };
  in_order(500, kWorkers, make, [](Counted&&) {});
  CHECK(alive == 0);
  CHECK(most <= 2 * static_cast<int>(kWorkers) + 1);  // and the one in use
}

TEST_CASE("the first failure in order comes out, after all before it were used") {
  for (const std::size_t workers : {1, 4}) {
    std::vector<std::size_t> seen;
    std::string what;
    const auto make = [](std::size_t i) {
      if (i >= 20 && i % 2 == 0) throw std::runtime_error(std::to_string(i));
      return i;
    };
    try {
      in_order(100, workers, make, [&](std::size_t i) { seen.push_back(i); });
    } catch (const std::runtime_error& e) {
      what = e.what();
    }
    CHECK(what == "20");
    CHECK(seen.size() == 20);
  }
}

TEST_CASE("a use that throws ends the work") {
  const auto use = [](std::size_t i) {
    if (i == 5) throw std::runtime_error("use");
  };
  CHECK_THROWS_WITH(in_order(
                        1000, 2, [](std::size_t i) { return i; }, use),
                    "use");
}

}  // namespace kneeprint
