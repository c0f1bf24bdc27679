#include "stepper.hpp"

#include "clock.hpp"

namespace core {
namespace stepper {

namespace {

constexpr uint32_t WHOLE = 65536;

/** All of it is shared with interrupts: the main loop touches it under a lock only. */
struct {
  Phase phase;
  bool edgeStops;
  bool guardMet;
  bool settling;
  int8_t direction;
  int32_t count;
  int32_t guard;
  /** Steps to make, the armed one included. */
  uint32_t remaining;
  /** No interval is shorter. */
  uint32_t shortest;
  /** The interval in progress. */
  uint32_t current;
  Tick last;
  Tick settled;
  /** For `brake(true)`: first interval at the cap, and acceleration by cap. */
  uint32_t steepFirst;
  uint32_t steepRatio;
  Ramp ramp;
} leg;

bool active() { return leg.phase == Phase::armed || leg.phase == Phase::running; }

void endHere(Phase phase) {
  if (hal::disarm()) counted();
  leg.phase = phase;
}

}  // namespace

void start() {
  leg.phase = Phase::idle;
  leg.count = 0;
  leg.edgeStops = false;
  leg.guardMet = false;
  leg.settling = false;
}

void prepare(const Leg& wish) {
  leg.phase = Phase::prepared;
  leg.edgeStops = false;
  leg.guardMet = false;
  leg.direction = wish.counterClockwise ? 1 : -1;
  leg.guard = wish.guard;
  leg.remaining = wish.steps;
  leg.shortest = cruiseInterval(wish.speed);
  leg.steepFirst = firstInterval(wish.steepest);
  leg.steepRatio = ratioOf(wish.acceleration, wish.steepest);
  begin(leg.ramp, firstInterval(wish.acceleration));
  hal::setDirection(wish.counterClockwise);
}

void goAt(Tick at) {
  leg.last = at;
  leg.current = 0;
  // An input that forbids motion changed while the leg was worked out (SPEC 11.1, 11.2).
  if (leg.phase != Phase::prepared) return;
  if (leg.remaining == 0) {
    leg.phase = Phase::done;
    return;
  }
  leg.phase = Phase::armed;
  leg.last += hal::armStep(at);
}

Tick go(Tick delay) {
  hal::Lock lock;
  const Tick soonest = hal::ticks() + 2 * hal::LEAD + delay;
  goAt(leg.settling && !reached(leg.settled, soonest) ? leg.settled : soonest);
  return leg.last;
}

void brake(bool steep) {
  hal::Lock lock;
  if (!active()) return;
  const bool change = steep && leg.steepRatio < WHOLE;
  const uint32_t level = change ? scaledLevel(leg.ramp.level, leg.steepRatio) : leg.ramp.level;
  if (leg.phase == Phase::armed || level == 0) return endHere(Phase::done);
  if (level + 1 < leg.remaining) leg.remaining = level + 1;
  if (!change) return;
  leg.ramp.first = leg.steepFirst;
  leg.ramp.level = level < leg.remaining ? level : leg.remaining - 1;
  leg.ramp.rest = 0;
  if (leg.ramp.interval < leg.shortest) leg.ramp.interval = leg.shortest;
  leg.shortest = leg.ramp.interval;
  leg.steepRatio = WHOLE;
}

void cut() {
  hal::Lock lock;
  if (leg.phase == Phase::prepared) leg.phase = Phase::cut;
  if (active()) endHere(Phase::cut);
}

void forbid() {
  if (leg.phase == Phase::prepared) leg.phase = Phase::done;
  if (leg.phase == Phase::armed) endHere(Phase::done);
}

void stopAtEdge(bool wanted) {
  hal::Lock lock;
  leg.edgeStops = wanted;
}

void edge() {
  if (leg.edgeStops && active()) endHere(Phase::done);
}

Phase phase() {
  hal::Lock lock;
  return leg.phase;
}

int32_t position() {
  hal::Lock lock;
  return active() && hal::uncountedStep() ? leg.count + leg.direction : leg.count;
}

void setZero(int32_t place) {
  hal::Lock lock;
  leg.count -= place;
}

Tick lastStep() {
  hal::Lock lock;
  return leg.last;
}

bool metGuard() {
  hal::Lock lock;
  const bool met = leg.guardMet;
  leg.guardMet = false;
  return met;
}

void rest() { leg.phase = Phase::idle; }

bool settling(Tick now, Tick& until) {
  hal::Lock lock;
  until = leg.settled;
  if (leg.settling && !active() && reached(leg.settled, now)) leg.settling = false;
  return leg.settling;
}

void counted() {
  leg.count += leg.direction;
  leg.remaining -= 1;
  leg.last += leg.current;
  leg.settling = true;
  leg.settled = leg.last + leg.ramp.first;
  if (leg.count == leg.guard) leg.guardMet = true;
  if (leg.remaining == 0) leg.phase = Phase::done;
}

void plan() {
  Ramp& ramp = leg.ramp;
  const uint32_t remaining = leg.remaining;
  if (remaining == 0) return;
  if (leg.phase == Phase::armed)
    leg.phase = Phase::running;
  else if (ramp.level >= remaining)
    slower(ramp);
  else if (ramp.level + 1 < remaining && ramp.interval > leg.shortest)
    faster(ramp);
  leg.current = ramp.interval > leg.shortest ? ramp.interval : leg.shortest;
}

void armPlanned() {
  if (leg.phase == Phase::running) leg.current += hal::armStep(leg.last + leg.current);
}

}  // namespace stepper
}  // namespace core
