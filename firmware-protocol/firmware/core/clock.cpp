#include "clock.hpp"

namespace core {
namespace clock {

namespace {

/** A whole second not far in the past, and its tick. */
Tick baseTick;
uint32_t baseSeconds;

constexpr uint32_t TICKS_PER_MS = hal::TICKS_PER_SECOND / 1000;
/** Differences of so many seconds still fit into ticks of 32 bits with a sign. */
constexpr uint32_t NEAR_SECONDS = 1000;

uint32_t millisecondsLate(uint32_t seconds) {
  const uint32_t late = baseSeconds - seconds;
  return late > UINT32_MAX / 1000 ? UINT32_MAX : late * 1000;
}

}  // namespace

void start() {
  baseTick = 0;
  baseSeconds = 0;
}

void advance(Tick now) {
  while (now - baseTick >= hal::TICKS_PER_SECOND && between(baseTick, now) > 0) {
    baseTick += hal::TICKS_PER_SECOND;
    baseSeconds += 1;
  }
}

Stamp stampOf(Tick at) {
  int32_t rest = between(baseTick, at);
  uint32_t seconds = baseSeconds;
  while (rest < 0) {
    rest += hal::TICKS_PER_SECOND;
    seconds -= 1;
  }
  while (rest >= static_cast<int32_t>(hal::TICKS_PER_SECOND)) {
    rest -= hal::TICKS_PER_SECOND;
    seconds += 1;
  }
  return Stamp{seconds, static_cast<uint32_t>(rest) / 2};
}

Ahead aheadOf(const Stamp& stamp, Tick now, Tick& at, uint32_t& ms) {
  if (stamp.seconds > baseSeconds + NEAR_SECONDS) return Ahead::far;
  if (stamp.seconds + NEAR_SECONDS < baseSeconds) {
    ms = millisecondsLate(stamp.seconds);
    return Ahead::past;
  }
  at = baseTick + (stamp.seconds - baseSeconds) * hal::TICKS_PER_SECOND + stamp.micros * 2;
  const int32_t ahead = between(now, at);
  // A motion is never late: what cannot be armed any more has passed (SPEC 8.2).
  if (ahead < static_cast<int32_t>(4 * hal::LEAD)) {
    ms = ahead >= 0 ? 1 : (static_cast<uint32_t>(-ahead) + TICKS_PER_MS - 1) / TICKS_PER_MS;
    return Ahead::past;
  }
  return ahead > static_cast<int32_t>(FURTHEST_TICKS) ? Ahead::far : Ahead::soon;
}

}  // namespace clock
}  // namespace core
