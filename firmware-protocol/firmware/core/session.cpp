#include "session.hpp"

#include "memory.hpp"

namespace core {
namespace session {

namespace {

/** The nearer half of the circle of numbers is ahead (SPEC 3.6). */
constexpr uint16_t HALF = 0x8000;

uint32_t current;
uint16_t count;
uint32_t epochOfSession;
uint16_t last;
char request[MAX_LINE];
uint8_t requestLength;
char reply[MAX_LINE];
uint8_t replyBytes;

bool isOpen(uint32_t session) { return session != 0 && session == current; }

bool same(const char* text, uint8_t length) {
  if (length != requestLength) return false;
  for (uint8_t index = 0; index < length; index += 1) {
    if (text[index] != request[index]) return false;
  }
  return true;
}

void copy(char* to, const char* from, uint8_t length) {
  for (uint8_t index = 0; index < length; index += 1) to[index] = from[index];
}

}  // namespace

void start() {
  current = 0;
  count = 0;
  epochOfSession = 0;
  last = 0;
  requestLength = 0;
}

uint32_t open(uint32_t epoch) {
  if (epoch < memory::highestEpoch()) return 0;
  memory::setHighestEpoch(epoch);
  epochOfSession = epoch;
  count += 1;
  current = (memory::bootCount() << 16) | count;
  // `00000000` is no session.
  if (current == 0) {
    count = 1;
    current = 1;
  }
  last = 0;
  requestLength = 0;
  return current;
}

bool isRepetition(const Request& incoming, const char* text, uint8_t length) {
  return isOpen(incoming.session) && requestLength != 0 && same(text, length);
}

Admission admit(const Request& incoming, const char* text, uint8_t length, Code& code, uint32_t& detail) {
  detail = 0;
  if (!isOpen(incoming.session)) {
    code = Code::session;
    return Admission::refused;
  }
  if (incoming.epoch != epochOfSession) {
    code = Code::epoch;
    detail = memory::highestEpoch();
    return Admission::refused;
  }
  const uint16_t ahead = incoming.number - last;
  if (ahead == 0) {
    if (isRepetition(incoming, text, length)) return Admission::repetition;
    code = Code::reused;
    return Admission::refused;
  }
  if (ahead < HALF) return Admission::fresh;
  code = Code::old;
  detail = last;
  return Admission::refused;
}

void keep(const Request& incoming, const char* text, uint8_t length, const char* answer, uint8_t answerLength) {
  const uint16_t ahead = incoming.number - last;
  if (!isOpen(incoming.session) || ahead == 0 || ahead >= HALF) return;
  last = incoming.number;
  copy(request, text, length);
  requestLength = length;
  copy(reply, answer, answerLength);
  replyBytes = answerLength;
}

const char* storedReply() { return reply; }
uint8_t storedLength() { return replyBytes; }

}  // namespace session
}  // namespace core
