/** CRC-16/CCITT-FALSE (SPEC 1.4). */
#pragma once
#include <stdint.h>

namespace core {

constexpr uint16_t CRC_START = 0xFFFF;

/** The remainder after one more byte. Shifts by whole nibbles instead of bits; no table. */
inline uint16_t crcStep(uint16_t crc, uint8_t byte) {
  uint8_t high = static_cast<uint8_t>(crc >> 8) ^ byte;
  high ^= high >> 4;
  return static_cast<uint16_t>((crc << 8) ^ (static_cast<uint16_t>(high) << 12) ^ (static_cast<uint16_t>(high) << 5) ^ high);
}

inline uint16_t crcOf(const char* bytes, uint8_t length) {
  uint16_t crc = CRC_START;
  while (length != 0) {
    crc = crcStep(crc, static_cast<uint8_t>(*bytes));
    bytes += 1;
    length -= 1;
  }
  return crc;
}

}  // namespace core
