/**
 * The interval law of a ramp: step n after the first one comes at √(2n/a), so the interval of level n is
 * c(n) = c(0)·(√(n+1) − √n) with c(0) = √(2/a). Small levels come from a table of exact ratios, larger ones from the
 * recurrence c(n) = c(n−1) − 2·c(n−1)/(4n+1) in whole ticks with a carried rest (D. Austin, Generate stepper-motor
 * speed profiles in real time, Embedded Systems Programming 2005). Everything rounds to longer intervals (SPEC 8.1).
 * With the recurrence from the first level on, c(0) would have to be taken 0.676 times as long to make up for its error there; exact ratios
 * have no such error, and so begin with c(0) itself.
 */
#pragma once
#include <stdint.h>

namespace core {

struct Ramp {
  /** c(0), ticks. */
  uint32_t first;
  /** c(level), ticks. */
  uint32_t interval;
  uint32_t rest;
  uint32_t level;
};

/** Levels below this one come from the table. */
constexpr uint8_t EXACT_LEVELS = 16;

/** c(0) in ticks for an acceleration in thousandths of a step per s². */
uint32_t firstInterval(uint32_t acceleration);
/** Ticks between steps for a speed in thousandths of a step per s. */
uint32_t cruiseInterval(uint32_t speed);
void begin(Ramp& ramp, uint32_t first);
/** One level faster. */
void faster(Ramp& ramp);
/** One level slower; not at level 0. */
void slower(Ramp& ramp);
/** `numerator`/`denominator` (at most 1) in parts of 65536, rounded up. */
uint32_t ratioOf(uint32_t numerator, uint32_t denominator);
/** The level of the same speed under an acceleration whose ratio to the new one is given, rounded up. */
uint32_t scaledLevel(uint32_t level, uint32_t ratio);

}  // namespace core
