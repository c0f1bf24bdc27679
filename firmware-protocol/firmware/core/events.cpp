#include "events.hpp"

#include "writer.hpp"

namespace core {
namespace events {

namespace {

/** SPEC 7.3: 32 of them are half a kilobyte, so kind and detail share a word with the microseconds. */
struct Event {
  uint32_t seconds;
  uint32_t micros : 20;
  uint32_t kind : 4;
  uint32_t which : 8;
  uint32_t tag;
  int32_t place;
};
static_assert(sizeof(Event) == 16, "the ring is a quarter of the board's memory");
static_assert((EVENT_RING & (EVENT_RING - 1)) == 0, "the place of an event in the ring is its number modulo the ring");

/** Room that an event leaves for a reply. */
constexpr uint8_t ROOM = 2 * MAX_LINE;
/** In `LEVEL_WORDS`, where the words for the two levels begin. */
constexpr uint8_t EDGE_WORDS = 0, INTERLOCK_WORDS = 2, SUPPLY_WORDS = 4, KEY_WORDS = 6;

Event ring[EVENT_RING];
uint32_t last;
/** Next one to be sent by itself. */
uint32_t fresh;
/** Those that were asked for. */
uint32_t again;
uint8_t againLeft;

bool isBefore(const Stamp& stamp, const Event& event) {
  return stamp.seconds < event.seconds || (stamp.seconds == event.seconds && stamp.micros < event.micros);
}

void compose(Writer& writer, uint32_t number) {
  const Event& event = ring[number % EVENT_RING];
  const Kind kind = static_cast<Kind>(event.kind);
  const uint8_t which = static_cast<uint8_t>(event.which);
  writer.character('e');
  writer.space();
  writer.whole(number);
  writer.space();
  writer.stamp(Stamp{event.seconds, event.micros});
  writer.space();
  writer.word(nth(EVENT_WORDS, static_cast<uint8_t>(kind)));
  writer.space();
  switch (kind) {
    case Kind::boot:
      return writer.word(nth(BOOT_WORDS, which));
    case Kind::warn:
      return writer.hex(event.tag, 8);
    case Kind::began:
    case Kind::homed:
      writer.hex(event.tag, 8);
      writer.space();
      return writer.place(event.place);
    case Kind::ended:
      writer.hex(event.tag, 8);
      writer.space();
      writer.place(event.place);
      writer.space();
      return writer.word(nth(CAUSE_WORDS, which));
    case Kind::edge:
      writer.place(event.place);
      writer.space();
      return writer.word(nth(LEVEL_WORDS, EDGE_WORDS + which));
    case Kind::interlock:
      return writer.word(nth(LEVEL_WORDS, INTERLOCK_WORDS + which));
    case Kind::supply:
      return writer.word(nth(LEVEL_WORDS, SUPPLY_WORDS + which));
    case Kind::key:
      return writer.word(nth(LEVEL_WORDS, KEY_WORDS + which));
    case Kind::lease:
    case Kind::limit:
      return writer.place(event.place);
  }
}

void sendOne(uint32_t number) {
  Writer writer(scratch);
  compose(writer, number);
  hal::send(scratch, writer.seal());
}

}  // namespace

void start() {
  last = 0;
  fresh = 1;
  againLeft = 0;
}

void note(Kind kind, Tick at, uint32_t tag, int32_t place, uint8_t which) {
  const Event& before = ring[last % EVENT_RING];
  Stamp stamp = clock::stampOf(at);
  // The flag is seen a few µs after the step that moved it: an event is not older than the one before, or the clock would seem to step.
  if (last != 0 && isBefore(stamp, before)) stamp = Stamp{before.seconds, before.micros};
  last += 1;
  Event& event = ring[last % EVENT_RING];
  event.seconds = stamp.seconds;
  event.micros = stamp.micros;
  event.kind = static_cast<uint8_t>(kind);
  event.which = which;
  event.tag = tag;
  event.place = place;
}

uint32_t newest() { return last; }

uint32_t oldest() { return last <= EVENT_RING ? (last == 0 ? 0 : 1) : last - EVENT_RING + 1; }

void sendAgain(uint32_t from) {
  again = from;
  const uint32_t kept = last - from + 1;
  againLeft = kept < EVENTS_AT_ONCE ? static_cast<uint8_t>(kept) : EVENTS_AT_ONCE;
}

bool sendNext() {
  if (againLeft == 0 && fresh > last) return false;
  if (hal::sendRoom() < ROOM) return false;
  // More happened than the line could carry: what left the ring is a gap that the host sees (SPEC 7.5).
  if (fresh < oldest()) fresh = oldest();
  if (againLeft != 0) {
    if (again >= oldest()) sendOne(again);
    again += 1;
    againLeft -= 1;
  } else {
    sendOne(fresh);
    fresh += 1;
  }
  return true;
}

}  // namespace events
}  // namespace core
