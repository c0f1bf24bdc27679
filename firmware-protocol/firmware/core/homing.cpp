/** Homing (SPEC 8.6): towards the edge, past it, below it, and up to it again, step by step. */
#include "active.hpp"
#include "events.hpp"
#include "inputs.hpp"

namespace core {
namespace motion {

namespace {

/** The last approach begins so far below the edge: enough to take up the play of a belt. */
constexpr int32_t CLEARANCE = 16;
/** The last approach gives up when it has gone so far. */
constexpr uint32_t APPROACH = 4 * CLEARANCE;

void turnTo(int32_t place, uint32_t speed) {
  const int32_t way = place - stepper::position();
  Leg leg;
  leg.counterClockwise = way > 0;
  leg.steps = static_cast<uint32_t>(way > 0 ? way : -way);
  leg.speed = speed;
  leg.acceleration = leg.steepest = body.limits.acceleration;
  leg.guard = NO_PLACE;
  stepper::prepare(leg);
}

/** A pace from which the table stands still without a further step: one interval of a ramp's first step. */
uint32_t creepSpeed() {
  const uint32_t pace = hal::TICKS_PER_SECOND * 1000 / firstInterval(body.limits.acceleration);
  const uint32_t speed = pace == 0 ? 1 : pace;
  return speed < body.limits.home ? speed : body.limits.home;
}

void approach() {
  active.homing = Homing::edge;
  active.edgeMet = false;
  turnTo(stepper::position() + static_cast<int32_t>(APPROACH), creepSpeed());
  stepper::stopAtEdge(true);
  stepper::go();
}

void giveUp() {
  body.known = false;
  finish(Cause::search, stepper::lastStep());
}

void arrive() {
  events::note(Kind::homed, stepper::lastStep(), active.tag, body.known ? active.edge : NO_PLACE);
  stepper::setZero(active.edge);
  body.known = true;
  finish(Cause::done, stepper::lastStep());
}

}  // namespace

void beginSearch() {
  const Limits& limits = body.limits;
  const int32_t travel = limits.greatest - limits.least + 1;
  active.homing = Homing::search;
  active.edgeMet = false;
  turnTo(stepper::position() + (inputs::covered() ? travel : -travel), limits.home);
  const bool settled = body.driversOn;
  switchDriversOn();
  begun(stepper::go(settled ? 0 : SETTLE));
}

void homingEdge(int32_t zero) {
  if (active.homing == Homing::search) {
    active.homing = Homing::past;
    active.edge = zero;
    stepper::brake(false);
  } else if (active.homing == Homing::edge && !active.edgeMet) {
    active.edgeMet = true;
    active.edge = zero;
  }
}

void homingLegOver() {
  // An edge on the very last step may be noticed but not yet told.
  inputs::tell();
  if (active.state != State::homing) return;
  switch (active.homing) {
    case Homing::search:
      return giveUp();
    case Homing::past:
      active.homing = Homing::below;
      turnTo(active.edge - CLEARANCE, body.limits.home);
      stepper::go();
      return;
    case Homing::below:
      return approach();
    case Homing::edge:
      return active.edgeMet ? arrive() : giveUp();
  }
}

}  // namespace motion
}  // namespace core
