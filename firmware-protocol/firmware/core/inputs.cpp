#include "inputs.hpp"

#include "clock.hpp"
#include "events.hpp"
#include "motion.hpp"
#include "stepper.hpp"

namespace core {
namespace inputs {

namespace {

struct Change {
  Tick at;
  int32_t place;
  uint8_t levels;
};

constexpr uint8_t CHANGES = 8;
Change changes[CHANGES];
uint8_t writing;
uint8_t reading;
/** Last noticed in the interrupt, and last told. */
uint8_t noticed;
uint8_t told;
/** Contacts that have closed but may still bounce, and since when. */
uint8_t closing;
Tick closedAt;

/** Contacts that guard people: opening acts at once, closing when it has lasted for so long. The others act both ways at once. */
constexpr uint8_t CONTACTS = hal::INTERLOCK_CLOSED | hal::SUPPLY_PRESENT;
constexpr Tick BOUNCE = hal::TICKS_PER_SECOND / 50;

uint8_t after(uint8_t index) { return static_cast<uint8_t>((index + 1) % CHANGES); }

/** A chattering input fills no memory: its newest change takes the place of the one before (the levels still tell the truth). */
void push(Tick at, uint8_t levels) {
  uint8_t slot = writing;
  if (after(writing) == reading)
    slot = static_cast<uint8_t>((writing + CHANGES - 1) % CHANGES);
  else
    writing = after(writing);
  changes[slot] = Change{at, stepper::position(), levels};
  noticed = levels;
}

/** Contacts that have been closed for long enough. */
void settle(Tick now) {
  hal::Lock lock;
  if (closing == 0) return;
  if (!reached(closedAt + BOUNCE, now)) return hal::wakeAt(closedAt + BOUNCE);
  push(closedAt, noticed | closing);
  closing = 0;
}

bool take(Change& change) {
  hal::Lock lock;
  if (reading == writing) return false;
  change = changes[reading];
  reading = after(reading);
  return true;
}

void tellOne(const Change& change) {
  const uint8_t differing = change.levels ^ told;
  told = change.levels;
  if (differing & hal::FLAG_COVERED) motion::passEdge(change.at, change.place, !covered());
  if (differing & hal::KEY_ON) events::note(Kind::key, change.at, 0, NO_PLACE, keyOn());
  if (differing & hal::INTERLOCK_CLOSED) {
    events::note(Kind::interlock, change.at, 0, NO_PLACE, interlockClosed());
    if (!interlockClosed()) motion::interlockOpened();
  }
  if (differing & hal::SUPPLY_PRESENT) {
    events::note(Kind::supply, change.at, 0, NO_PLACE, supplyPresent());
    if (!supplyPresent()) motion::cutOff(Cause::supply, change.at);
  }
}

}  // namespace

void start(Tick) {
  writing = reading = 0;
  closing = 0;
  noticed = told = hal::inputs();
}

void changed(Tick at) {
  const uint8_t now = hal::inputs();
  const uint8_t lost = noticed & static_cast<uint8_t>(~now) & CONTACTS;
  const uint8_t others = (noticed ^ now) & static_cast<uint8_t>(~CONTACTS);
  // What closes waits until its contact has come to rest; each bounce begins the wait anew.
  const uint8_t gained = now & static_cast<uint8_t>(~noticed) & CONTACTS;
  if (gained & static_cast<uint8_t>(~closing)) closedAt = at;
  closing = gained;
  if (lost & hal::SUPPLY_PRESENT) {
    stepper::cut();
    hal::setDrivers(false);
  }
  if (lost & hal::INTERLOCK_CLOSED) stepper::forbid();
  if (lost != 0 || others != 0) push(at, (noticed & static_cast<uint8_t>(~lost)) ^ others);
  if (others & hal::FLAG_COVERED) stepper::edge();
}

void tell() {
  settle(hal::ticks());
  Change change;
  while (take(change)) tellOne(change);
}

uint8_t safest() { return hal::inputs() & noticed; }

uint8_t levels() { return told; }

}  // namespace inputs
}  // namespace core
