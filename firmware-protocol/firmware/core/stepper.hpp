/** The steps of one leg, from standstill to standstill: exact in number, each planned in the interrupt of the one before. */
#pragma once
#include "protocol.hpp"
#include "ramp.hpp"

namespace core {

struct Leg {
  bool counterClockwise;
  uint32_t steps;
  /** Thousandths of a step per s and s². `steepest`: the acceleration cap, for stops (SPEC 9.2). */
  uint32_t speed;
  uint32_t acceleration;
  uint32_t steepest;
  /** Do not step further than here without a word (SPEC 7.1, `limit`); `NO_PLACE` for no such place. */
  int32_t guard;
};

namespace stepper {

/** `idle`: no leg since the last `rest`. `prepared`: not yet sent off. `armed`: before the first step. `cut`: ended by `cut`, in the middle of anything. */
enum class Phase : uint8_t { idle, prepared, armed, running, done, cut };

void start();
/** Computes a leg; a few ms. Nothing may be running. */
void prepare(const Leg& leg);
/** First step as soon as can be, `delay` ticks later at least. Gives its tick. No step where `cut` or `forbid` came since `prepare`. */
Tick go(Tick delay = 0);
/** First step at `at` to the tick. Under a lock, or in an interrupt. */
void goAt(Tick at);
/** Ends by braking: with the leg's own acceleration, or the steepest. No further step when it is slow enough for that. */
void brake(bool steep);
/** No further step at all. Also in interrupts. */
void cut();
/** A leg that has not made its first step makes none. In interrupts. */
void forbid();
/** As soon as the flag changes its level there is no further step: only for legs slow enough (SPEC 8.6). */
void stopAtEdge(bool wanted);
/** In the interrupt of the inputs: the flag changed. */
void edge();

Phase phase();
/** Counted position, the step that was just made included. */
int32_t position();
/** The count is set to 0 at `place`. At rest. */
void setZero(int32_t place);
/** Tick of the last step. */
Tick lastStep();
/** True once when the guard was met. */
bool metGuard();
/** After `done`. */
void rest();
/**
 * A table that has just made its last step needs the first interval of a ramp before it may turn back: both together are no
 * steeper than the ramp (SPEC 8.1). True while that lasts, until `until`.
 */
bool settling(Tick now, Tick& until);

/** In the step interrupt: the step that was armed has been made. */
void counted();
/** In the step interrupt, others allowed: plans the next one. */
void plan();
/** In the step interrupt, others forbidden: arms what was planned, unless something came between. */
void armPlanned();

}  // namespace stepper
}  // namespace core
