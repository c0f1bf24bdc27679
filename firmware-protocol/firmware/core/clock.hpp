/** The controller's time (SPEC 2.3, 6.5): ticks that wrap become seconds that do not. */
#pragma once
#include "protocol.hpp"

namespace core {

struct Stamp {
  uint32_t seconds;
  uint32_t micros;
};

/** Ticks from `from` to `to`, negative when `to` comes first; right within 1073 s. */
inline int32_t between(Tick from, Tick to) { return static_cast<int32_t>(to - from); }
inline bool reached(Tick at, Tick now) { return between(at, now) >= 0; }

namespace clock {

void start();
/** Must be called at least once in 1000 s. */
void advance(Tick now);
/** The stamp of an instant within 1000 s of the last `advance`. */
Stamp stampOf(Tick at);
/** Whether a stamp lies in the past (`ms` by how much), further ahead than SPEC 8.2 allows, or at the tick `at`. */
enum class Ahead : uint8_t { past, soon, far };
Ahead aheadOf(const Stamp& stamp, Tick now, Tick& at, uint32_t& ms);

}  // namespace clock
}  // namespace core
