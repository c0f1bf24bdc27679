/**
 * Timer 1 runs free at 2 MHz: it is the clock, and its compare output A is the STEP pin. The edge of a step is made by
 * the timer alone, so no interrupt shifts it; the interrupt after it only counts and plans the next one.
 */
#include <avr/interrupt.h>
#include <util/delay_basic.h>

#include "../core/motion.hpp"
#include "../core/stepper.hpp"
#include "board.hpp"

namespace board {

namespace {

/** Compare output modes: STEP rises, falls, or belongs to the port, where it is low. */
constexpr uint8_t RISES = _BV(COM1A1) | _BV(COM1A0);
constexpr uint8_t FALLS = _BV(COM1A1);
/** Less than this, in ticks, is too near to be armed. */
constexpr uint8_t NEAR = 16;
/** A pulse lasts at least so many loops of 3 cycles: 5 µs. */
constexpr uint8_t PULSE_LOOPS = 27;
constexpr int32_t ONE_TURN = 65000;

volatile uint16_t turns;
uint16_t passes;
bool armed;
bool stepWanted;
bool waking;
hal::Tick wake;

void endPulse() {
  TCCR1A = FALLS;
  TCCR1C = _BV(FOC1A);
  TCCR1A = 0;
}

/**
 * The compare matches once in each turn of the timer; all but the last match are let pass. No match may slip through
 * between looking at the clock and counting them.
 */
uint16_t arm(hal::Tick at, bool step) {
  uint16_t late = 0;
  int32_t ahead;
  for (;;) {
    OCR1A = static_cast<uint16_t>(at);
    TIFR1 = _BV(OCF1A);
    ahead = static_cast<int32_t>(at - ticksNow());
    if (ahead < NEAR) {
      const uint16_t more = static_cast<uint16_t>(NEAR + 4 - ahead);
      at += more;
      late += more;
    } else if (!(TIFR1 & _BV(OCF1A))) {
      break;
    }
  }
  passes = static_cast<uint16_t>(static_cast<uint32_t>(ahead - 1) >> 16);
  stepWanted = step;
  armed = true;
  if (step && passes == 0) TCCR1A = RISES;
  TIMSK1 |= _BV(OCIE1A);
  return late;
}

}  // namespace

hal::Tick ticksNow() {
  const uint16_t low = TCNT1;
  uint16_t high = turns;
  if ((TIFR1 & _BV(TOV1)) && low < 0x8000) high += 1;
  return (static_cast<uint32_t>(high) << 16) | low;
}

void startTimer() {
  TCCR1A = 0;
  TCCR1B = _BV(CS11);
  TIMSK1 = _BV(TOIE1);
}

ISR(TIMER1_OVF_vect) {
  turns += 1;
  stirred = true;
}

ISR(TIMER1_COMPA_vect) {
  if (passes != 0) {
    passes -= 1;
    if (passes == 0 && stepWanted) TCCR1A = RISES;
    return;
  }
  TIMSK1 &= static_cast<uint8_t>(~_BV(OCIE1A));
  armed = false;
  stirred = true;
  if (!stepWanted) return core::motion::test();
  core::stepper::counted();
  // The division of 32 bits takes 40 µs, in which the line and the inputs are heard.
  sei();
  core::stepper::plan();
  cli();
  endPulse();
  core::stepper::armPlanned();
}

ISR(TIMER1_COMPB_vect) {
  TIMSK1 &= static_cast<uint8_t>(~_BV(OCIE1B));
  waking = false;
  stirred = true;
}

}  // namespace board

namespace hal {

Tick ticks() {
  Lock lock;
  return board::ticksNow();
}

uint16_t armStep(Tick at) { return board::arm(at, true); }

void armTest(Tick at) { board::arm(at, false); }

bool uncountedStep() { return board::armed && board::stepWanted && board::passes == 0 && (TIFR1 & _BV(OCF1A)); }

bool disarm() {
  if (!board::armed) return false;
  // The next match is moved a whole turn away, so what the flag says now stays true.
  OCR1A = TCNT1 - 1;
  const bool made = uncountedStep();
  if (made) _delay_loop_1(board::PULSE_LOOPS);
  TIMSK1 &= static_cast<uint8_t>(~_BV(OCIE1A));
  board::armed = false;
  board::endPulse();
  TIFR1 = _BV(OCF1A);
  return made;
}

void wakeAt(Tick at) {
  Lock lock;
  const int32_t ahead = static_cast<int32_t>(at - board::ticksNow());
  if (ahead > board::ONE_TURN) return;
  if (ahead < board::NEAR) {
    board::stirred = true;
    return;
  }
  if (board::waking && static_cast<int32_t>(board::wake - at) <= 0) return;
  board::wake = at;
  board::waking = true;
  OCR1B = static_cast<uint16_t>(at);
  TIFR1 = _BV(OCF1B);
  TIMSK1 |= _BV(OCIE1B);
}

}  // namespace hal
