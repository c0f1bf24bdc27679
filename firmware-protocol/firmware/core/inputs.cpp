#include "inputs.hpp"

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

uint8_t after(uint8_t index) { return static_cast<uint8_t>((index + 1) % CHANGES); }

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
  noticed = told = hal::inputs();
}

void changed(Tick at) {
  const uint8_t now = hal::inputs();
  const uint8_t differing = now ^ noticed;
  if (differing == 0) return;
  if ((differing & ~now) & hal::SUPPLY_PRESENT) {
    stepper::cut();
    hal::setDrivers(false);
  }
  const int32_t place = stepper::position();
  if (differing & hal::FLAG_COVERED) stepper::edge();
  // A chattering contact fills no memory: its newest change takes the place of the one before (the levels still tell the truth).
  uint8_t slot = writing;
  if (after(writing) == reading)
    slot = static_cast<uint8_t>((writing + CHANGES - 1) % CHANGES);
  else
    writing = after(writing);
  changes[slot] = Change{at, place, now};
  noticed = now;
}

void tell() {
  Change change;
  while (take(change)) tellOne(change);
}

uint8_t levels() { return told; }

}  // namespace inputs
}  // namespace core
