#include "controller.hpp"

#include "events.hpp"
#include "inputs.hpp"
#include "memory.hpp"
#include "motion.hpp"
#include "request.hpp"
#include "session.hpp"
#include "writer.hpp"

namespace core {
namespace controller {

Intake intake;

namespace {

constexpr uint32_t MOST_TURN_US = 999999;
const char OK[] FLASH = "ok ";
const char NO[] FLASH = "no ";
const char HI[] FLASH = "hi ";
const char LIM[] FLASH = "lim ";

uint16_t dropped;

/** SPEC 5.1. T3 is taken here, before anything is composed. */
void head(Writer& writer, const Request& request, Tick received) {
  const uint32_t turn = (hal::ticks() - received) / 2;
  writer.character('r');
  writer.space();
  writer.hex(request.session, 8);
  writer.space();
  writer.whole(request.number);
  writer.space();
  writer.stamp(clock::stampOf(received));
  writer.space();
  writer.padded(turn > MOST_TURN_US ? MOST_TURN_US : turn, 6);
  writer.space();
}

/** SPEC 5.4. */
uint16_t flags() {
  uint16_t sum = 0;
  if (motion::known()) sum |= 0x001;
  if (inputs::interlockClosed()) sum |= 0x002;
  if (inputs::supplyPresent()) sum |= 0x004;
  if (inputs::keyOn()) sum |= 0x008;
  if (motion::driversOn()) sum |= 0x010;
  if (inputs::covered()) sum |= 0x020;
  if (motion::leaseLive()) sum |= 0x040;
  if (motion::ended()) sum |= 0x080;
  if (motion::warningDue()) sum |= 0x100;
  return sum;
}

void ok(Writer& writer) {
  writer.word(OK);
  writer.word(nth(STATE_WORDS, static_cast<uint8_t>(motion::state())));
  writer.space();
  writer.place(motion::place());
  writer.space();
  writer.hex(flags(), 3);
  writer.space();
  writer.whole(events::newest());
  writer.space();
  writer.whole(dropped);
}

/** SPEC 12. A limit is the only detail that may be negative. */
void no(Writer& writer, Code code, uint32_t detail) {
  writer.word(NO);
  writer.word(nth(REFUSAL_WORDS, static_cast<uint8_t>(code)));
  writer.space();
  if (code == Code::travel)
    writer.position(static_cast<int32_t>(detail));
  else
    writer.whole(detail);
}

void hi(Writer& writer, uint32_t opened) {
  writer.word(HI);
  writer.whole(MAJOR);
  writer.character('.');
  writer.whole(MINOR);
  writer.space();
  writer.hex(memory::bootCount(), 8);
  writer.space();
  writer.hex(opened, 8);
  writer.space();
  writer.whole(RESOLUTION_US);
  writer.space();
  writer.hex(CAPABILITIES, 4);
  writer.space();
  writer.word(FIRMWARE);
}

void lim(Writer& writer) {
  const Limits& limits = motion::limits();
  writer.word(LIM);
  writer.position(limits.least);
  writer.space();
  writer.position(limits.greatest);
  writer.space();
  writer.whole(limits.speed);
  writer.space();
  writer.whole(limits.acceleration);
  writer.space();
  writer.whole(limits.home);
}

/** SPEC 8.10. */
Code teach(const Request& request, uint32_t& detail) {
  if (motion::state() == State::fault) {
    detail = static_cast<uint32_t>(motion::fault());
    return Code::fault;
  }
  if (motion::state() != State::rest) return Code::busy;
  if (!inputs::keyOn()) return Code::key;
  if (request.speed > GREATEST_SPEED) {
    detail = GREATEST_SPEED;
    return Code::speed;
  }
  const Limits limits = {request.place, request.greatest, request.speed, request.acceleration, request.home};
  memory::setLimits(limits);
  motion::setLimits(limits);
  return Code::none;
}

/** Carries an order of an open session out; gives its refusal. */
Code carryOut(const Request& request, Tick received, uint32_t& detail) {
  switch (request.order) {
    case Order::renew:
      motion::renewLease(received);
      return Code::none;
    case Order::events:
      if (request.from >= events::oldest() && request.from <= events::newest()) return Code::none;
      detail = events::oldest();
      return Code::gone;
    case Order::home:
    case Order::move:
    case Order::nudge:
      return motion::order(request, detail);
    case Order::teach:
      return teach(request, detail);
    default:
      return Code::none;
  }
}

uint8_t sendSealed(Writer& writer, const char* text) {
  const uint8_t length = writer.seal();
  hal::send(text, length);
  return length;
}

void refuse(const Request& request, Tick received, Code code, uint32_t detail) {
  Writer writer(scratch);
  head(writer, request, received);
  no(writer, code, detail);
  sendSealed(writer, scratch);
}

void sendStored() { hal::send(session::storedReply(), session::storedLength()); }

void answerSession(const Request& request, const Line& line, uint8_t length) {
  Code code = Code::none;
  uint32_t detail = 0;
  switch (session::admit(request, line.text, length, code, detail)) {
    case session::Admission::repetition:
      return sendStored();
    case session::Admission::refused:
      return refuse(request, line.received, code, detail);
    case session::Admission::fresh:
      break;
  }
  code = request.unusable != Code::none ? request.unusable : carryOut(request, line.received, detail);
  Writer writer(scratch);
  head(writer, request, line.received);
  if (code != Code::none)
    no(writer, code, detail);
  else if (request.order == Order::limits || request.order == Order::teach)
    lim(writer);
  else
    ok(writer);
  session::keep(request, line.text, length, scratch, sendSealed(writer, scratch));
  if (request.order == Order::events && code == Code::none) events::sendAgain(request.from);
}

/** SPEC 9.4: in every state, from everyone; only a true repetition does nothing. */
void obeyStop(const Request& request, const Line& line, uint8_t length) {
  if (session::isRepetition(request, line.text, length)) return sendStored();
  motion::endLease();
  if (request.order == Order::off)
    motion::cutOff(Cause::off, hal::ticks());
  else if (request.order == Order::hold)
    motion::brake(Cause::hold, false);
  else
    motion::stop(request.free);
  Writer writer(scratch);
  head(writer, request, line.received);
  ok(writer);
  session::keep(request, line.text, length, scratch, sendSealed(writer, scratch));
}

void hello(const Request& request, Tick received) {
  if (request.epoch > memory::highestEpoch()) motion::endLease();
  const uint32_t opened = session::open(request.epoch);
  if (opened == 0) return refuse(request, received, Code::epoch, memory::highestEpoch());
  motion::newSession();
  Writer writer(scratch);
  head(writer, request, received);
  hi(writer, opened);
  sendSealed(writer, scratch);
}

void ident(const Request& request, Tick received) {
  Writer writer(scratch);
  head(writer, request, received);
  hi(writer, 0);
  sendSealed(writer, scratch);
}

void obey(const Request& request, const Line& line) {
  const uint8_t length = withoutReturn(line.text, line.length);
  switch (request.order) {
    case Order::hold:
    case Order::stop:
    case Order::off:
      return obeyStop(request, line, length);
    case Order::hello:
      if (request.unusable == Code::none) return hello(request, line.received);
      break;
    case Order::ident:
      if (request.unusable == Code::none) return ident(request, line.received);
      break;
    default:
      break;
  }
  answerSession(request, line, length);
}

bool receive() {
  if (!intake.ready()) return false;
  const Line& line = intake.first();
  Request request;
  if (readRequest(line.text, line.length, request))
    obey(request, line);
  else
    dropped += 1;
  intake.release();
  return true;
}

void countLost() {
  hal::Lock lock;
  dropped += intake.lost();
}

}  // namespace

void start(hal::BootCause cause) {
  intake.clear();
  dropped = 0;
  clock::start();
  events::start();
  session::start();
  memory::start();
  motion::start(memory::limits());
  const Tick now = hal::ticks();
  inputs::start(now);
  clock::advance(now);
  events::note(Kind::boot, now, 0, NO_PLACE, static_cast<uint8_t>(cause));
}

bool turn() {
  const Tick now = hal::ticks();
  clock::advance(now);
  motion::noticeBeginning(now);
  inputs::tell();
  bool more = receive();
  countLost();
  motion::poll(hal::ticks());
  hal::setLamp(motion::state() != State::rest);
  more = events::sendNext() || more;
  more = memory::poll(now) || more;
  return more;
}

void fail(uint8_t number) { motion::fail(static_cast<motion::Fault>(number)); }

}  // namespace controller
}  // namespace core
