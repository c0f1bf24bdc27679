/** The serial line: 115200 Bd (really 117647, 2.1 % fast, as every board at 16 MHz), 8N1, by interrupts (SPEC 1.1). */
#include <avr/interrupt.h>

#include "../core/controller.hpp"
#include "board.hpp"

namespace board {

namespace {

constexpr uint16_t DIVISOR = 16;
/** As large as its indices: they wrap by themselves. */
char outgoing[256];
volatile uint8_t writing;
volatile uint8_t reading;
/** A byte that no line may have. */
constexpr uint8_t BROKEN = 0;

}  // namespace

void startLine() {
  UBRR0 = DIVISOR;
  UCSR0A = _BV(U2X0);
  UCSR0C = _BV(UCSZ01) | _BV(UCSZ00);
  UCSR0B = _BV(RXCIE0) | _BV(RXEN0) | _BV(TXEN0);
}

ISR(USART_RX_vect) {
  const uint8_t status = UCSR0A;
  uint8_t byte = UDR0;
  // A byte without its stop bit, or one that overran another, spoils its line.
  if (status & (_BV(FE0) | _BV(DOR0))) byte = BROKEN;
  // T2 of SPEC 6.1 is taken here.
  core::controller::intake.take(byte, byte == '\n' ? ticksNow() : 0);
  stirred = true;
}

ISR(USART_UDRE_vect) {
  UDR0 = static_cast<uint8_t>(outgoing[reading]);
  reading = static_cast<uint8_t>(reading + 1);
  // Switched off with the last byte: no further interrupt comes to find nothing.
  if (reading == writing) UCSR0B &= static_cast<uint8_t>(~_BV(UDRIE0));
  stirred = true;
}

}  // namespace board

namespace hal {

uint8_t sendRoom() { return static_cast<uint8_t>(board::reading - board::writing - 1); }

void send(const char* bytes, uint8_t length) {
  // Replies may follow each other faster than the line takes them; the watchdog bounds the wait.
  while (sendRoom() < length) {
  }
  for (uint8_t index = 0; index < length; index += 1) {
    board::outgoing[board::writing] = bytes[index];
    board::writing = static_cast<uint8_t>(board::writing + 1);
  }
  Lock lock;
  UCSR0B |= _BV(UDRIE0);
}

}  // namespace hal
