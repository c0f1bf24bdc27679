/** The host's stand-in for a board: memory, pins, a turntable, and a clock that goes on only when it is told to. */
#pragma once
#include "../hal/hal.hpp"

namespace host {

constexpr uint16_t MEMORY_BYTES = 1024;

struct Bench {
  /** Ticks since the beginning, never wrapping; those since the last start are `now - startedAt`. */
  uint64_t now;
  uint64_t startedAt;
  /** The one armed instant. */
  bool armed;
  bool stepWanted;
  uint64_t armedFor;
  /** The step that the hardware has made and nobody counted yet. */
  bool uncounted;
  uint64_t alarm;
  uint8_t levels;
  bool counterClockwise;
  bool driversOn;
  bool warningOn;
  /** Of the table: microsteps from the edge, and the play that the motor must take up. */
  int32_t place;
  int32_t motor;
  int32_t play;
  bool tellSteps;
  uint8_t memory[MEMORY_BYTES];
  uint64_t memoryDone;
  bool waitForMemory;
  /** Bytes that may still be written before the power fails; negative: as many as one likes. */
  int32_t writesLeft;
  uint32_t writes;
};

extern Bench bench;

void startBench();
/** Lets everything happen up to this tick. */
void runTo(uint64_t tick);
/** Sets levels of inputs and tells the core, as the interrupt would. */
void setLevels(uint8_t levels);
/** The flag shows where the table stands. */
uint8_t withFlag(uint8_t levels);
/** The controller starts (again). */
void restart(hal::BootCause cause);
/** Bytes arrive now. */
void arrive(const char* bytes, unsigned length);

}  // namespace host
