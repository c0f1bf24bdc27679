#include "writer.hpp"

namespace core {

char scratch[MAX_LINE];

namespace {
const char NONE[] FLASH = "none";
const uint32_t POWERS[] FLASH = {1000000000, 100000000, 10000000, 1000000, 100000, 10000, 1000, 100, 10, 1};
constexpr uint8_t MOST_DIGITS = 10;
}  // namespace

void Writer::word(const char* text) {
  for (char letter = hal::flashByte(text); letter != '\0'; letter = hal::flashByte(text)) {
    character(letter);
    text += 1;
  }
}

void Writer::whole(uint32_t value) {
  uint8_t digits = 1;
  while (digits < MOST_DIGITS && value >= hal::flashLong(POWERS + (MOST_DIGITS - 1 - digits))) digits += 1;
  padded(value, digits);
}

/** By subtraction: a division of 32 bits takes 40 µs on the board. */
void Writer::padded(uint32_t value, uint8_t digits) {
  for (uint8_t index = static_cast<uint8_t>(MOST_DIGITS - digits); index < MOST_DIGITS; index += 1) {
    const uint32_t power = hal::flashLong(POWERS + index);
    char digit = '0';
    while (value >= power) {
      value -= power;
      digit += 1;
    }
    character(digit);
  }
}

void Writer::position(int32_t value) {
  if (value < 0) character('-');
  whole(value < 0 ? static_cast<uint32_t>(-value) : static_cast<uint32_t>(value));
}

void Writer::place(int32_t value) {
  if (value == NO_PLACE)
    word(NONE);
  else
    position(value);
}

void Writer::hex(uint32_t value, uint8_t digits) {
  while (digits != 0) {
    digits -= 1;
    const uint8_t digit = static_cast<uint8_t>(value >> (4 * digits)) & 0x0F;
    character(static_cast<char>(digit < 10 ? '0' + digit : 'A' - 10 + digit));
  }
}

void Writer::stamp(const Stamp& stamp) {
  padded(stamp.seconds, 9);
  character('.');
  padded(stamp.micros, 6);
}

uint8_t Writer::seal() {
  const uint16_t crc = crc_;
  space();
  hex(crc, 4);
  *at_ = '\n';
  at_ += 1;
  return static_cast<uint8_t>(at_ - start_);
}

}  // namespace core
