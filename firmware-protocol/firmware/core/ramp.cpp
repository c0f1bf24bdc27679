#include "ramp.hpp"

#include "../hal/flash.hpp"
#include "../hal/hal.hpp"

namespace core {

namespace {

/** 65536·(√(n+1) − √n) for n = 1 to 15, rounded up. Level 0 is c(0) itself. */
const uint16_t RATIOS[EXACT_LEVELS] FLASH = {0,     27146, 20830, 17561, 15471, 13987, 12863, 11972,
                                             11245, 10636, 10116, 9666,  9271,  8920,  8607,  8325};

uint32_t exactInterval(uint32_t first, uint8_t level) {
  if (level == 0) return first;
  const uint32_t ratio = hal::flashWord(RATIOS + level);
  const uint32_t low = (first & 0xFFFF) * ratio;
  return (first >> 16) * ratio + (low >> 16) + 1;
}

uint32_t rootRoundedUp(uint64_t square) {
  uint64_t rest = square;
  uint64_t root = 0;
  uint64_t bit = static_cast<uint64_t>(1) << 62;
  while (bit > rest) bit >>= 2;
  while (bit != 0) {
    if (rest >= root + bit) {
      rest -= root + bit;
      root = (root >> 1) + bit;
    } else {
      root >>= 1;
    }
    bit >>= 2;
  }
  return static_cast<uint32_t>(root) + (rest != 0 ? 1 : 0);
}

}  // namespace

uint32_t firstInterval(uint32_t acceleration) {
  // (ticks per second)² · 2 / (acceleration / 1000)
  constexpr uint64_t NUMERATOR = static_cast<uint64_t>(hal::TICKS_PER_SECOND) * hal::TICKS_PER_SECOND * 2000;
  return rootRoundedUp((NUMERATOR + acceleration - 1) / acceleration);
}

uint32_t cruiseInterval(uint32_t speed) {
  constexpr uint32_t NUMERATOR = hal::TICKS_PER_SECOND * 1000;
  return NUMERATOR / speed + (NUMERATOR % speed != 0 ? 1 : 0);
}

void begin(Ramp& ramp, uint32_t first) {
  ramp.first = first;
  ramp.interval = first;
  ramp.rest = 0;
  ramp.level = 0;
}

void faster(Ramp& ramp) {
  ramp.level += 1;
  if (ramp.level < EXACT_LEVELS) {
    ramp.interval = exactInterval(ramp.first, static_cast<uint8_t>(ramp.level));
    return;
  }
  const uint32_t numerator = 2 * ramp.interval + ramp.rest;
  const uint32_t denominator = 4 * ramp.level + 1;
  const uint32_t change = numerator / denominator;
  ramp.rest = numerator - change * denominator;
  ramp.interval -= change;
}

void slower(Ramp& ramp) {
  const uint32_t level = ramp.level;
  ramp.level = level - 1;
  if (ramp.level < EXACT_LEVELS) {
    ramp.interval = exactInterval(ramp.first, static_cast<uint8_t>(ramp.level));
    ramp.rest = 0;
    return;
  }
  // c(n−1) from c(n), by the same relation turned round.
  const uint32_t numerator = 2 * ramp.interval + ramp.rest;
  const uint32_t denominator = 4 * level - 1;
  const uint32_t change = numerator / denominator;
  ramp.rest = numerator - change * denominator;
  ramp.interval += change;
}

uint32_t ratioOf(uint32_t numerator, uint32_t denominator) {
  return static_cast<uint32_t>(((static_cast<uint64_t>(numerator) << 16) + denominator - 1) / denominator);
}

uint32_t scaledLevel(uint32_t level, uint32_t ratio) {
  return (level >> 16) * ratio + (((level & 0xFFFF) * ratio + 0xFFFF) >> 16);
}

}  // namespace core
