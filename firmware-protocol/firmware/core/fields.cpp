#include "fields.hpp"

namespace core {

namespace {

/** Decimal digits only; at most ten of them, the caller sees to that. False also when the number does not fit into 32 bits. */
bool readDigits(const char* text, uint8_t length, uint32_t& value) {
  if (length == 0) return false;
  uint32_t sum = 0;
  for (uint8_t index = 0; index < length; index += 1) {
    const uint8_t digit = static_cast<uint8_t>(text[index] - '0');
    if (digit > 9) return false;
    if (sum > 429496729u || (sum == 429496729u && digit > 5)) return false;
    sum = sum * 10 + digit;
  }
  value = sum;
  return true;
}

}  // namespace

bool Fields::next(Field& field) {
  if (over_) return false;
  field.text = at_;
  while (at_ != end_ && *at_ != ' ') at_ += 1;
  field.length = static_cast<uint8_t>(at_ - field.text);
  if (at_ == end_)
    over_ = true;
  else
    at_ += 1;
  return true;
}

bool readWhole(const Field& field, uint32_t greatest, uint32_t& value) {
  if (field.length > 10 || (field.length > 1 && field.text[0] == '0')) return false;
  return readDigits(field.text, field.length, value) && value <= greatest;
}

bool readPosition(const Field& field, int32_t& value) {
  const bool negative = field.length != 0 && field.text[0] == '-';
  const Field digits = negative ? Field{field.text + 1, static_cast<uint8_t>(field.length - 1)} : field;
  uint32_t size;
  if (!readWhole(digits, GREATEST_POSITION, size) || (negative && size == 0)) return false;
  value = negative ? -static_cast<int32_t>(size) : static_cast<int32_t>(size);
  return true;
}

bool readRate(const Field& field, uint32_t& value) { return readWhole(field, GREATEST_RATE, value) && value != 0; }

bool readHex(const Field& field, uint8_t digits, uint32_t& value) {
  if (field.length != digits) return false;
  uint32_t sum = 0;
  for (uint8_t index = 0; index < digits; index += 1) {
    const char byte = field.text[index];
    uint8_t digit;
    if (byte >= '0' && byte <= '9')
      digit = static_cast<uint8_t>(byte - '0');
    else if (byte >= 'A' && byte <= 'F')
      digit = static_cast<uint8_t>(byte - 'A' + 10);
    else
      return false;
    sum = (sum << 4) | digit;
  }
  value = sum;
  return true;
}

bool readStamp(const Field& field, uint32_t& seconds, uint32_t& micros) {
  return field.length == 16 && field.text[9] == '.' && readDigits(field.text, 9, seconds) && readDigits(field.text + 10, 6, micros);
}

bool isWord(const Field& field) {
  for (uint8_t index = 0; index < field.length; index += 1) {
    if (field.text[index] < 'a' || field.text[index] > 'z') return false;
  }
  return field.length != 0;
}

bool isThis(const Field& field, const char* word) {
  for (uint8_t index = 0; index < field.length; index += 1) {
    const char letter = hal::flashByte(word + index);
    if (letter == '\0' || letter != field.text[index]) return false;
  }
  return hal::flashByte(word + field.length) == '\0';
}

uint8_t indexOf(const Field& field, const char* words, uint8_t count) {
  for (uint8_t index = 0; index < count; index += 1) {
    if (isThis(field, words)) return index;
    words = nth(words, 1);
  }
  return count;
}

bool allowed(char byte) {
  return (byte >= 'a' && byte <= 'z') || (byte >= '0' && byte <= '9') || (byte >= 'A' && byte <= 'F') || byte == ' ' || byte == '-' ||
         byte == '.';
}

}  // namespace core
