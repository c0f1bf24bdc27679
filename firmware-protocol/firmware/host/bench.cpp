#include "bench.hpp"

#include <inttypes.h>
#include <stdio.h>
#include <string.h>

#include "../core/controller.hpp"
#include "../core/inputs.hpp"
#include "../core/motion.hpp"
#include "../core/stepper.hpp"

namespace host {

Bench bench;

namespace {

constexpr uint64_t NEVER = UINT64_MAX;
/** The board's timer interrupts at least so often. */
constexpr uint64_t HEARTBEAT = 65536;
/** A byte of the EEPROM takes 3.4 ms. */
constexpr uint64_t BYTE = 6800;

void turnUntilQuiet() {
  for (int turns = 0; turns < 1000 && core::controller::turn(); turns += 1) {
  }
}

/** The motor moves the table when it has taken up the play. */
void turnTable() {
  bench.motor += bench.counterClockwise ? 1 : -1;
  if (bench.place > bench.motor) bench.place = bench.motor;
  if (bench.place < bench.motor - bench.play) bench.place = bench.motor - bench.play;
}

void step() {
  const bool covered = bench.place < 0;
  if (bench.driversOn) turnTable();
  if (bench.tellSteps) printf("%" PRIu64 " step %d\n", bench.now - bench.startedAt, bench.counterClockwise ? 1 : -1);
  bench.uncounted = true;
  // The interrupt of the inputs has priority over that of the timer.
  if (covered != (bench.place < 0)) setLevels(withFlag(bench.levels));
  bench.armed = false;
  if (!bench.uncounted) return;
  bench.uncounted = false;
  core::stepper::counted();
  core::stepper::plan();
  core::stepper::armPlanned();
}

uint64_t earlier(uint64_t one, uint64_t other) { return one < other ? one : other; }

uint64_t nextDue() {
  const uint64_t beat = (bench.now / HEARTBEAT + 1) * HEARTBEAT;
  const uint64_t armed = bench.armed ? bench.armedFor : NEVER;
  const uint64_t alarm = bench.alarm > bench.now ? bench.alarm : NEVER;
  return earlier(earlier(beat, armed), alarm);
}

}  // namespace

void startBench() {
  memset(&bench, 0, sizeof bench);
  memset(bench.memory, 0xFF, sizeof bench.memory);
  bench.alarm = NEVER;
  bench.writesLeft = -1;
  bench.levels = hal::INTERLOCK_CLOSED | hal::SUPPLY_PRESENT | hal::KEY_ON;
}

void runTo(uint64_t tick) {
  for (uint64_t due = nextDue(); due <= tick; due = nextDue()) {
    bench.now = due;
    if (bench.armed && bench.armedFor <= due) {
      if (bench.stepWanted) {
        step();
      } else {
        bench.armed = false;
        core::motion::test();
      }
    }
    turnUntilQuiet();
  }
  bench.now = tick;
  turnUntilQuiet();
}

void setLevels(uint8_t levels) {
  bench.levels = levels;
  core::inputs::changed(hal::ticks());
}

uint8_t withFlag(uint8_t levels) {
  const uint8_t without = levels & static_cast<uint8_t>(~hal::FLAG_COVERED);
  return bench.place < 0 ? without | hal::FLAG_COVERED : without;
}

void restart(hal::BootCause cause) {
  bench.startedAt = bench.now;
  bench.armed = false;
  bench.alarm = NEVER;
  bench.waitForMemory = true;
  core::controller::start(cause);
  bench.waitForMemory = false;
  turnUntilQuiet();
}

void arrive(const char* bytes, unsigned length) {
  for (unsigned index = 0; index < length; index += 1) {
    core::controller::intake.take(static_cast<uint8_t>(bytes[index]), hal::ticks());
    if (bytes[index] == '\n') turnUntilQuiet();
  }
}

}  // namespace host

namespace hal {

using host::bench;

Tick ticks() { return static_cast<Tick>(bench.now - bench.startedAt); }
uint8_t inputs() { return bench.levels; }

Lock::Lock() : before_(0) {}
Lock::~Lock() { (void)before_; }

void setDirection(bool counterClockwise) { bench.counterClockwise = counterClockwise; }
void setDrivers(bool on) { bench.driversOn = on; }
void setWarning(bool on) { bench.warningOn = on; }
void setLamp(bool) {}

namespace {

uint64_t whenIs(Tick at) { return bench.now + static_cast<uint64_t>(static_cast<int64_t>(static_cast<int32_t>(at - ticks()))); }

}  // namespace

uint16_t armStep(Tick at) {
  bench.armed = true;
  bench.stepWanted = true;
  bench.armedFor = whenIs(at);
  if (bench.armedFor > bench.now) return 0;
  const uint64_t late = bench.now + 1 - bench.armedFor;
  bench.armedFor = bench.now + 1;
  return static_cast<uint16_t>(late);
}

void armTest(Tick at) {
  armStep(at);
  bench.stepWanted = false;
}

bool disarm() {
  bench.armed = false;
  const bool made = bench.uncounted;
  bench.uncounted = false;
  return made;
}

bool uncountedStep() { return bench.uncounted; }

uint8_t sendRoom() { return 255; }

void send(const char* bytes, uint8_t length) {
  printf("%" PRIu64 " ", bench.now - bench.startedAt);
  fwrite(bytes, 1, length, stdout);
}

uint8_t readMemory(uint16_t address) { return bench.memory[address % host::MEMORY_BYTES]; }

bool memoryBusy() {
  // While it starts, the controller waits for its memory and for nothing else.
  if (bench.waitForMemory && bench.now < bench.memoryDone) bench.now = bench.memoryDone;
  return bench.now < bench.memoryDone;
}

void writeMemory(uint16_t address, uint8_t value) {
  bench.memoryDone = bench.now + host::BYTE;
  if (bench.writesLeft == 0) return;
  if (bench.writesLeft > 0) bench.writesLeft -= 1;
  bench.writes += 1;
  bench.memory[address % host::MEMORY_BYTES] = value;
}

void wakeAt(Tick at) {
  const uint64_t when = whenIs(at);
  if (when > bench.now && (bench.alarm <= bench.now || when < bench.alarm)) bench.alarm = when;
}

}  // namespace hal
