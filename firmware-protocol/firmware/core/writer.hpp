/** Composes a line and its check word (SPEC 1.2, 1.4) in a buffer of `MAX_LINE` bytes. */
#pragma once
#include "clock.hpp"
#include "crc.hpp"
#include "protocol.hpp"

namespace core {

/** The line that is being composed, one at a time; not on the stack, which is short on the board. */
extern char scratch[MAX_LINE];

class Writer {
 public:
  explicit Writer(char* buffer) : start_(buffer), at_(buffer), crc_(CRC_START) {}
  void character(char byte) {
    *at_ = byte;
    at_ += 1;
    crc_ = crcStep(crc_, static_cast<uint8_t>(byte));
  }
  void space() { character(' '); }
  /** A word in program memory. */
  void word(const char* text);
  void whole(uint32_t value);
  void position(int32_t value);
  /** A position, or `none`. */
  void place(int32_t value);
  void hex(uint32_t value, uint8_t digits);
  /** Exactly `digits` decimal digits. */
  void padded(uint32_t value, uint8_t digits);
  void stamp(const Stamp& stamp);
  /** Adds check word and line feed; gives the length of the line. */
  uint8_t seal();

 private:
  char* start_;
  char* at_;
  uint16_t crc_;
};

}  // namespace core
