/** Whether an order to move is accepted, and its beginning (SPEC 8, 12.2). */
#include "active.hpp"
#include "clock.hpp"
#include "events.hpp"
#include "inputs.hpp"

namespace core {
namespace motion {

namespace {

Code refuse(Code code, uint32_t& detail, uint32_t value) {
  detail = value;
  return code;
}

uint32_t size(int32_t value) { return value < 0 ? static_cast<uint32_t>(-value) : static_cast<uint32_t>(value); }

/** What every order to move needs (SPEC 8.5, 8.9); one at a time (SPEC 8.3). */
Code circumstances(const Request& request) {
  if (isRepeat(request.tag)) return Code::repeat;
  if (active.state != State::rest) return Code::busy;
  if (body.ended) return Code::stopped;
  if (request.order == Order::nudge && !inputs::keyOn()) return Code::key;
  if (!inputs::interlockClosed()) return Code::interlock;
  if (!inputs::supplyPresent()) return Code::supply;
  if (request.order == Order::move && !body.known) return Code::unknown;
  return body.leaseLive ? Code::none : Code::lease;
}

Code withinLimits(const Request& request, uint32_t& detail) {
  const Limits& limits = body.limits;
  if (request.place < limits.least) return refuse(Code::travel, detail, static_cast<uint32_t>(limits.least));
  if (request.place > limits.greatest) return refuse(Code::travel, detail, static_cast<uint32_t>(limits.greatest));
  if (request.speed > limits.speed) return refuse(Code::speed, detail, limits.speed);
  if (request.acceleration > limits.acceleration) return refuse(Code::ramp, detail, limits.acceleration);
  return Code::none;
}

/** SPEC 8.9: at most a 36th of the soft travel, rounded up. */
Code nudgeAllowed(const Request& request, uint32_t& detail) {
  const uint32_t most = (static_cast<uint32_t>(body.limits.greatest - body.limits.least) + 35) / 36;
  return request.place == 0 || size(request.place) > most ? refuse(Code::travel, detail, most) : Code::none;
}

/** SPEC 8.2 and 11.6: sets `active.begin`. */
Code whenToBegin(const Request& request, Tick now, uint32_t& detail) {
  if (!request.timed) {
    active.begin = body.warningDue ? now + WARNING_TICKS : now;
    return Code::none;
  }
  uint32_t late = 0;
  switch (clock::aheadOf(Stamp{request.seconds, request.micros}, now, active.begin, late)) {
    case clock::Ahead::past:
      return refuse(Code::past, detail, late);
    case clock::Ahead::far:
      return refuse(Code::far, detail, FURTHEST_MS);
    default:
      break;
  }
  Tick settled;
  if (stepper::settling(now, settled) && !reached(settled, active.begin)) return refuse(Code::past, detail, 1);
  if (body.warningDue && between(now, active.begin) < static_cast<int32_t>(WARNING_TICKS))
    return refuse(Code::warning, detail, WARNING_MS);
  return Code::none;
}

void prepareMove(const Request& request) {
  const int32_t way = request.place - active.from;
  Leg leg;
  leg.counterClockwise = way > 0;
  leg.steps = size(way);
  leg.speed = request.speed;
  leg.acceleration = request.acceleration;
  leg.steepest = body.limits.acceleration;
  leg.guard = way > 0 ? body.limits.greatest + 1 : body.limits.least - 1;
  stepper::prepare(leg);
}

void warn(Tick now) {
  events::note(Kind::warn, now, active.tag);
  body.warningOn = true;
  body.warningUntil = now + WARNING_TICKS;
  hal::setWarning(true);
}

void beginNudge() {
  Leg leg;
  leg.counterClockwise = active.target > active.from;
  leg.steps = size(active.target - active.from);
  leg.speed = body.limits.home;
  leg.acceleration = leg.steepest = body.limits.acceleration;
  leg.guard = NO_PLACE;
  stepper::prepare(leg);
  const Tick delay = body.driversOn ? 0 : SETTLE;
  switchDriversOn();
  begun(stepper::go(delay));
}

void accept(const Request& request, Tick now) {
  body.anyTag = true;
  body.lastTag = active.tag = request.tag;
  active.order = request.order;
  active.cause = Cause::done;
  active.launch = Launch::none;
  active.state = State::waiting;
  if (body.warningDue) warn(now);
  if (request.order == Order::nudge) active.target = active.from + request.place;
  if (request.order != Order::move) {
    if (!body.warningDue) beginByItself();
    return;
  }
  active.target = request.place;
  if (!request.timed && !body.warningDue) return begun(stepper::go());
  hal::Lock lock;
  active.launch = Launch::armed;
  hal::armTest(active.begin - 2 * hal::LEAD);
}

}  // namespace

void beginByItself() {
  if (active.order == Order::home)
    beginSearch();
  else
    beginNudge();
}

Code order(const Request& request, uint32_t& detail) {
  if (active.state == State::fault) return refuse(Code::fault, detail, static_cast<uint32_t>(body.fault));
  const Code plain = circumstances(request);
  if (plain != Code::none) return plain;
  active.from = stepper::position();
  if (request.order == Order::move) {
    const Code code = withinLimits(request, detail);
    if (code != Code::none) return code;
    // Computing the leg takes milliseconds, so it comes before the time is looked at: a motion is never late.
    prepareMove(request);
  } else if (request.order == Order::nudge) {
    const Code code = nudgeAllowed(request, detail);
    if (code != Code::none) return code;
  }
  const Tick now = hal::ticks();
  const Code code = whenToBegin(request, now, detail);
  if (code != Code::none) return code;
  // While the leg was worked out an input may have opened: its interrupt knows, the main loop not yet.
  const uint8_t levels = inputs::safest();
  if (!(levels & hal::INTERLOCK_CLOSED)) return Code::interlock;
  if (!(levels & hal::SUPPLY_PRESENT)) return Code::supply;
  accept(request, now);
  return Code::none;
}

}  // namespace motion
}  // namespace core
