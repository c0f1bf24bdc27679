/** Start and main loop on the board. */
#include <avr/interrupt.h>
#include <avr/power.h>
#include <avr/sleep.h>
#include <avr/wdt.h>

#include "../core/controller.hpp"
#include "../core/inputs.hpp"
#include "../core/motion.hpp"
#include "board.hpp"

extern uint8_t __heap_start;

namespace board {

volatile bool stirred;

namespace {

/** Lies between the variables and the stack; a stack that reaches it has been too deep. */
constexpr uint8_t SENTINEL = 0xA5;
volatile uint8_t* const sentinel = &__heap_start;

hal::BootCause causeOfStart() {
  const uint8_t status = MCUSR;
  MCUSR = 0;
  if (status & _BV(WDRF)) return hal::BootCause::watchdog;
  if (status & _BV(PORF)) return hal::BootCause::power;
  if (status & _BV(BORF)) return hal::BootCause::brownout;
  return status & _BV(EXTRF) ? hal::BootCause::button : hal::BootCause::power;
}

void startPins() {
  PORTB = 0;
  DDRB = DIRECTION | STEP | LAMP;
  PORTC = INPUTS;
  PORTD = DRIVERS_OFF;
  DDRD = WARNING | DRIVERS_OFF;
  PCMSK1 = INPUTS;
}

void listenToInputs() {
  hal::Lock lock;
  PCIFR = _BV(PCIF1);
  PCICR = _BV(PCIE1);
  core::inputs::changed(ticksNow());
}

void sleepUnlessStirred() {
  cli();
  if (!stirred) {
    sleep_enable();
    sei();
    sleep_cpu();
    sleep_disable();
  }
  sei();
}

}  // namespace

ISR(PCINT1_vect) {
  core::inputs::changed(ticksNow());
  stirred = true;
}

}  // namespace board

namespace hal {

Lock::Lock() : before_(SREG) { cli(); }
Lock::~Lock() {
  asm volatile("" ::: "memory");
  SREG = before_;
}

uint8_t inputs() { return static_cast<uint8_t>((PINC ^ board::LOW_MEANS_YES) & board::INPUTS); }

void setDirection(bool counterClockwise) {
  if (counterClockwise)
    PORTB |= board::DIRECTION;
  else
    PORTB &= static_cast<uint8_t>(~board::DIRECTION);
}

void setDrivers(bool on) {
  if (on)
    PORTD &= static_cast<uint8_t>(~board::DRIVERS_OFF);
  else
    PORTD |= board::DRIVERS_OFF;
}

void setWarning(bool on) {
  if (on)
    PORTD |= board::WARNING;
  else
    PORTD &= static_cast<uint8_t>(~board::WARNING);
}

void setLamp(bool on) {
  if (on)
    PORTB |= board::LAMP;
  else
    PORTB &= static_cast<uint8_t>(~board::LAMP);
}

}  // namespace hal

int main() {
  wdt_reset();
  const hal::BootCause cause = board::causeOfStart();
  wdt_disable();
  board::startPins();
  power_all_disable();
  power_timer1_enable();
  power_usart0_enable();
  board::startTimer();
  sei();
  core::controller::start(cause);
  board::startLine();
  board::listenToInputs();
  *board::sentinel = board::SENTINEL;
  wdt_enable(WDTO_500MS);
  set_sleep_mode(SLEEP_MODE_IDLE);
  for (;;) {
    wdt_reset();
    board::stirred = false;
    if (!core::controller::turn()) board::sleepUnlessStirred();
    if (*board::sentinel != board::SENTINEL) {
      *board::sentinel = board::SENTINEL;
      core::controller::fail(static_cast<uint8_t>(core::motion::Fault::stack));
    }
  }
}
