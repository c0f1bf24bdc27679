/** The EEPROM, byte by byte. */
#include "board.hpp"

namespace hal {

bool memoryBusy() { return (EECR & _BV(EEPE)) != 0; }

uint8_t readMemory(uint16_t address) {
  while (memoryBusy()) {
  }
  EEAR = address;
  EECR |= _BV(EERE);
  return EEDR;
}

void writeMemory(uint16_t address, uint8_t value) {
  EEAR = address;
  EEDR = value;
  Lock lock;
  // The second bit must follow the first within four cycles.
  EECR = _BV(EEMPE);
  EECR |= _BV(EEPE);
}

}  // namespace hal
