#include "motion.hpp"

#include "active.hpp"
#include "clock.hpp"
#include "events.hpp"
#include "inputs.hpp"

namespace core {
namespace motion {

Active active;
Body body;

namespace {

/** SPEC 8.7, 11.5. */
void release() {
  body.known = false;
  body.driversOn = false;
  hal::setDrivers(false);
}

void releaseAtRest() {
  if (!body.freeAtRest || active.state != State::rest) return;
  body.freeAtRest = false;
  release();
}

bool needsLease() { return active.state == State::waiting || active.state == State::moving || active.state == State::homing; }

void cancel(Cause cause) {
  Launch launch;
  {
    hal::Lock lock;
    launch = active.launch;
    active.launch = Launch::none;
    if (launch == Launch::armed) hal::disarm();
  }
  if (launch == Launch::begun) {
    stepper::brake(false);
    // The first step was made a few microseconds ago: then it is a motion that is braked.
    if (stepper::phase() == stepper::Phase::running || stepper::position() != active.from) {
      begun(active.begin);
      active.state = State::braking;
      active.cause = cause;
      return;
    }
  }
  finish(cause, hal::ticks());
}

void pollWaiting(Tick now) {
  noticeBeginning(now);
  if (active.state != State::waiting) return;
  if (active.order != Order::move) {
    if (!reached(active.begin, now)) return hal::wakeAt(active.begin);
    const Cause cause = hindrance(inputs::safest(), now);
    if (cause != Cause::done) return finish(cause, now);
    return beginByItself();
  }
  Launch launch;
  {
    hal::Lock lock;
    launch = active.launch;
  }
  if (launch == Launch::begun) return hal::wakeAt(active.begin);
  if (launch == Launch::refused) finish(active.cause, hal::ticks());
}

void pollMotion() {
  if (active.state == State::moving && stepper::metGuard()) {
    events::note(Kind::limit, stepper::lastStep(), 0, place());
    brake(Cause::limit, true);
  }
  const stepper::Phase phase = stepper::phase();
  if (phase != stepper::Phase::done) return;
  if (active.state == State::homing) return homingLegOver();
  if (active.state == State::moving && stepper::position() != active.target) {
    // An interlock that opened before the first step has ended the leg, and may not yet be told.
    inputs::tell();
    if (active.state == State::moving) fail(Fault::count);
    return;
  }
  finish(active.state == State::moving ? Cause::done : active.cause, stepper::lastStep());
}

void pollLease(Tick now) {
  if (!body.leaseLive) return;
  if (!reached(body.leaseUntil, now)) return hal::wakeAt(body.leaseUntil);
  body.leaseLive = false;
}

void pollWarning(Tick now) {
  if (!body.warningOn) return;
  if (!reached(body.warningUntil, now)) return hal::wakeAt(body.warningUntil);
  body.warningOn = false;
  hal::setWarning(false);
}

}  // namespace

/** SPEC 8.8, 11.5. */
void switchDriversOn() {
  body.driversOn = true;
  hal::setDrivers(true);
}

void start(const Limits& limits) {
  body = Body();
  body.limits = limits;
  body.warningDue = true;
  active = Active();
  active.state = State::rest;
  hal::setDrivers(false);
  hal::setWarning(false);
  stepper::start();
}

State state() { return active.state; }
int32_t place() { return body.known ? stepper::position() : NO_PLACE; }
bool known() { return body.known; }
bool driversOn() { return body.driversOn; }
bool warningDue() { return body.warningDue; }
bool ended() { return body.ended; }
Fault fault() { return body.fault; }
const Limits& limits() { return body.limits; }
void setLimits(const Limits& limits) { body.limits = limits; }
bool isRepeat(uint32_t tag) { return body.anyTag && body.lastTag == tag; }

void renewLease(Tick received) {
  hal::Lock lock;
  body.leaseUntil = received + LEASE_TICKS;
  body.leaseLive = true;
}

void endLease() {
  hal::Lock lock;
  body.leaseLive = false;
}

bool leaseLive() { return body.leaseLive; }

Cause hindrance(uint8_t levels, Tick at) {
  if (!body.leaseLive || reached(body.leaseUntil, at)) return Cause::lease;
  if (!(levels & hal::INTERLOCK_CLOSED)) return Cause::interlock;
  if (!(levels & hal::SUPPLY_PRESENT)) return Cause::supply;
  if (active.order == Order::move && (!body.known || active.target < body.limits.least || active.target > body.limits.greatest))
    return Cause::limit;
  return Cause::done;
}

void test() {
  if (active.launch != Launch::armed) return;
  active.cause = hindrance(inputs::safest(), active.begin);
  if (active.cause != Cause::done) {
    active.launch = Launch::refused;
    return;
  }
  active.launch = Launch::begun;
  stepper::goAt(active.begin);
}

void noticeBeginning(Tick now) {
  Launch launch;
  {
    hal::Lock lock;
    launch = active.launch;
  }
  if (active.state == State::waiting && launch == Launch::begun && reached(active.begin, now)) begun(active.begin);
}

void begun(Tick at) {
  active.state = active.order == Order::home ? State::homing : State::moving;
  active.launch = Launch::none;
  active.cause = Cause::done;
  body.warningDue = false;
  events::note(Kind::began, at, active.tag, body.known ? active.from : NO_PLACE);
}

void finish(Cause cause, Tick at) {
  stepper::rest();
  active.state = body.fault == Fault::none ? State::rest : State::fault;
  events::note(Kind::ended, at, active.tag, place(), static_cast<uint8_t>(cause));
  releaseAtRest();
}

void brake(Cause cause, bool steep) {
  switch (active.state) {
    case State::rest:
    case State::fault:
      return;
    case State::waiting:
      return cancel(cause);
    default:
      stepper::stopAtEdge(false);
      stepper::brake(steep);
      if (active.state != State::braking || cause != Cause::lease) active.cause = cause;
      active.state = State::braking;
  }
}

void cutOff(Cause cause, Tick at) {
  {
    hal::Lock lock;
    if (active.state == State::waiting) hal::disarm();
    active.launch = Launch::none;
  }
  stepper::cut();
  const bool busy = active.state != State::rest && active.state != State::fault;
  release();
  if (busy) finish(cause, at);
}

void interlockOpened() {
  endLease();
  body.warningDue = true;
  brake(Cause::interlock, true);
}

void stop(bool free) {
  body.ended = true;
  if (free) body.freeAtRest = true;
  brake(Cause::stop, true);
  releaseAtRest();
}

void newSession() {
  body.ended = false;
  if (active.state == State::waiting) brake(Cause::session, false);
}

void passEdge(Tick at, int32_t raw, bool uncovered) {
  events::note(Kind::edge, at, 0, body.known ? raw : NO_PLACE, uncovered);
  if (active.state == State::homing) homingEdge(uncovered ? raw : raw + 1);
}

void fail(Fault fault) {
  body.fault = fault;
  endLease();
  if (active.state == State::rest) active.state = State::fault;
  cutOff(Cause::fault, hal::ticks());
}

void poll(Tick now) {
  pollLease(now);
  pollWarning(now);
  if (!body.leaseLive && needsLease()) {
    events::note(Kind::lease, now, 0, place());
    brake(Cause::lease, false);
  }
  switch (active.state) {
    case State::waiting:
      return pollWaiting(now);
    case State::moving:
    case State::homing:
    case State::braking:
      return pollMotion();
    default: {
      // Only so that an instant long ago is not mistaken for one to come when the ticks wrap.
      Tick settled;
      stepper::settling(now, settled);
    }
  }
}

}  // namespace motion
}  // namespace core
