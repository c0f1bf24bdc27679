/** ATmega328P at 16 MHz: what its parts share. The pins are those of docs/wiring.md. */
#pragma once
#include <avr/io.h>

#include "../hal/hal.hpp"

#if F_CPU != 16000000UL
#error "clock and baud rate are worked out for 16 MHz"
#endif

namespace board {

// Port B
constexpr uint8_t DIRECTION = _BV(PB0);
constexpr uint8_t STEP = _BV(PB1);  // OC1A: the timer itself makes the edge
constexpr uint8_t LAMP = _BV(PB5);
// Port C: a broken wire reads high, by the pull-ups: flag covered, interlock open, supply lost, key off
constexpr uint8_t INPUTS = _BV(PC0) | _BV(PC1) | _BV(PC2) | _BV(PC3);
constexpr uint8_t LOW_MEANS_YES = _BV(PC1) | _BV(PC2) | _BV(PC3);
// Port D
constexpr uint8_t WARNING = _BV(PD6);
constexpr uint8_t DRIVERS_OFF = _BV(PD7);

/** An interrupt left work for the main loop, so it must not go to sleep. */
extern volatile bool stirred;

void startTimer();
void startLine();
/** `hal::ticks` where interrupts are off. */
hal::Tick ticksNow();

}  // namespace board
