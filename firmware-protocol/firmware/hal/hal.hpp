/**
 * The thin hardware layer: all that the core asks of a board. `board/` gives it for the ATmega328P, `host/` for tests.
 * Times are ticks of half a microsecond since the start; they wrap after 2147 s, so only differences are meaningful.
 */
#pragma once
#include <stdint.h>

namespace hal {

using Tick = uint32_t;
constexpr uint32_t TICKS_PER_SECOND = 2000000;

/** SPEC 7.1. */
enum class BootCause : uint8_t { power, button, brownout, watchdog };

/** Levels of the inputs as bits of one byte; the reading of a broken wire is the safe one. */
constexpr uint8_t FLAG_COVERED = 1;
constexpr uint8_t INTERLOCK_CLOSED = 2;
constexpr uint8_t SUPPLY_PRESENT = 4;
constexpr uint8_t KEY_ON = 8;

Tick ticks();
uint8_t inputs();

/** No interrupt between making and destroying one. */
class Lock {
 public:
  Lock();
  ~Lock();
  Lock(const Lock&) = delete;
  Lock& operator=(const Lock&) = delete;

 private:
  uint8_t before_;
};

/** Positive direction is counter-clockwise (SPEC 2.4). Set at least `LEAD` before the first step. */
void setDirection(bool counterClockwise);
void setDrivers(bool on);
void setWarning(bool on);
void setLamp(bool on);

/** So far ahead an instant must lie, at least, when it is given to `armStep` or `armTest`. */
constexpr Tick LEAD = 64;
/**
 * One step at `at`, to the tick; then `stepper::counted` and `stepper::plan` are called. An instant that has passed, or
 * nearly, becomes one a little later; gives by how many ticks. Under a lock or in an interrupt.
 */
uint16_t armStep(Tick at);
/** `motion::test` is called at `at`, without a step. Under a lock. */
void armTest(Tick at);
/** No further step. True when one was made that was not yet counted. Under a lock. */
bool disarm();
/** True when a step was made that was not yet counted. Under a lock. */
bool uncountedStep();

/** Bytes that `send` takes at once. */
uint8_t sendRoom();
void send(const char* bytes, uint8_t length);

uint8_t readMemory(uint16_t address);
/** True while a byte is being written. */
bool memoryBusy();
/** Begins to write one byte; not while busy. The board wakes when it is done. */
void writeMemory(uint16_t address, uint8_t value);

/** An interrupt comes at this tick at the latest, so that the main loop looks again. */
void wakeAt(Tick at);

}  // namespace hal
