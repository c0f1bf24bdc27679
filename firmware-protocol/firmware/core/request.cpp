#include "request.hpp"

#include "crc.hpp"
#include "fields.hpp"

namespace core {

namespace {

constexpr uint8_t CHECK_LENGTH = 5;
const char NOW[] FLASH = "now";
const char FREE[] FLASH = "free";

bool readHello(Fields& fields, Request&) {
  Field major, minor;
  uint32_t version;
  return fields.next(major) && fields.next(minor) && readWhole(major, 99, version) && readWhole(minor, 99, version);
}

bool readTag(Fields& fields, Request& request) {
  Field tag;
  return fields.next(tag) && readHex(tag, 8, request.tag);
}

bool readMove(Fields& fields, Request& request) {
  Field place, speed, acceleration, begin;
  if (!readTag(fields, request) || !fields.next(place) || !fields.next(speed) || !fields.next(acceleration) || !fields.next(begin))
    return false;
  request.timed = !isThis(begin, NOW);
  return readPosition(place, request.place) && readRate(speed, request.speed) && readRate(acceleration, request.acceleration) &&
         (!request.timed || readStamp(begin, request.seconds, request.micros));
}

bool readNudge(Fields& fields, Request& request) {
  Field steps;
  return readTag(fields, request) && fields.next(steps) && readPosition(steps, request.place);
}

/** SPEC 8.10: an order that contradicts itself is refused by `field`, as one out of range. */
bool readTeach(Fields& fields, Request& request) {
  Field least, greatest, speed, acceleration, home;
  if (!fields.next(least) || !fields.next(greatest) || !fields.next(speed) || !fields.next(acceleration) || !fields.next(home))
    return false;
  return readPosition(least, request.place) && readPosition(greatest, request.greatest) && readRate(speed, request.speed) &&
         readRate(acceleration, request.acceleration) && readRate(home, request.home) && request.place < request.greatest &&
         request.home <= request.speed;
}

bool readEvents(Fields& fields, Request& request) {
  Field from;
  return fields.next(from) && readWhole(from, UINT32_MAX, request.from);
}

/** SPEC 4.1: `stop keep` unless its one field is `free`. */
void readStop(Fields& fields, Request& request) {
  Field drivers;
  request.free = fields.next(drivers) && fields.over() && isThis(drivers, FREE);
}

bool readOrder(Fields& fields, Request& request) {
  switch (request.order) {
    case Order::hold:
    case Order::off:
      return true;
    case Order::stop:
      readStop(fields, request);
      return true;
    case Order::hello:
      return readHello(fields, request) && fields.over();
    case Order::events:
      return readEvents(fields, request) && fields.over();
    case Order::home:
      return readTag(fields, request) && fields.over();
    case Order::move:
      return readMove(fields, request) && fields.over();
    case Order::nudge:
      return readNudge(fields, request) && fields.over();
    case Order::teach:
      return readTeach(fields, request) && fields.over();
    default:
      return fields.over();
  }
}

/** SPEC 1.2 to 1.4. The length of the body, 0 when the line is broken. */
uint8_t checkedBody(const char* text, uint8_t length) {
  if (length > MAX_LINE - 1 || length <= CHECK_LENGTH) return 0;
  for (uint8_t index = 0; index < length; index += 1) {
    if (!allowed(text[index])) return 0;
  }
  const uint8_t body = static_cast<uint8_t>(length - CHECK_LENGTH);
  uint32_t check;
  if (text[body] != ' ' || !readHex(Field{text + body + 1, 4}, 4, check) || check != crcOf(text, body)) return 0;
  return body;
}

}  // namespace

bool readRequest(const char* text, uint8_t length, Request& request) {
  const uint8_t body = checkedBody(text, withoutReturn(text, length));
  if (body == 0) return false;
  Fields fields(text, body);
  Field kind, epoch, session, number, word;
  if (!fields.next(kind) || !fields.next(epoch) || !fields.next(session) || !fields.next(number) || !fields.next(word)) return false;
  uint32_t value;
  if (kind.length != 1 || kind.text[0] != 'q' || !readWhole(epoch, UINT32_MAX, request.epoch) || !readHex(session, 8, request.session) ||
      !readWhole(number, UINT16_MAX, value) || !isWord(word))
    return false;
  request.number = static_cast<uint16_t>(value);
  request.free = false;
  request.timed = false;
  request.order = static_cast<Order>(indexOf(word, ORDER_WORDS, static_cast<uint8_t>(Order::unknown)));
  if (request.order == Order::unknown)
    request.unusable = Code::word;
  else
    request.unusable = readOrder(fields, request) ? Code::none : Code::field;
  return true;
}

}  // namespace core
