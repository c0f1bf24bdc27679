/** Constant words and tables that live in program memory on the board, where there is little other memory. */
#pragma once
#include <stdint.h>

#ifdef __AVR__
#include <avr/pgmspace.h>
#define FLASH PROGMEM
namespace hal {
inline char flashByte(const char* place) { return static_cast<char>(pgm_read_byte(place)); }
inline uint16_t flashWord(const uint16_t* place) { return pgm_read_word(place); }
inline uint32_t flashLong(const uint32_t* place) { return pgm_read_dword(place); }
}  // namespace hal
#else
#define FLASH
namespace hal {
inline char flashByte(const char* place) { return *place; }
inline uint16_t flashWord(const uint16_t* place) { return *place; }
inline uint32_t flashLong(const uint32_t* place) { return *place; }
}  // namespace hal
#endif
