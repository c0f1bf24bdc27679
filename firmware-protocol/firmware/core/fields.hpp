/** Readers of single fields (SPEC 2.1 to 2.4): each takes exactly what the specification asks for. */
#pragma once
#include "protocol.hpp"

namespace core {

struct Field {
  const char* text;
  uint8_t length;
};

/** Goes through the fields of a body, which exactly one space separates (SPEC 1.7). */
class Fields {
 public:
  Fields(const char* text, uint8_t length) : at_(text), end_(text + length), over_(false) {}
  /** The next field, empty ones included; false after the last one. */
  bool next(Field& field);
  bool over() const { return over_; }

 private:
  const char* at_;
  const char* end_;
  bool over_;
};

/** A whole number from 0 to `greatest` without leading zeros. */
bool readWhole(const Field& field, uint32_t greatest, uint32_t& value);
bool readPosition(const Field& field, int32_t& value);
bool readRate(const Field& field, uint32_t& value);
/** Upper-case hexadecimal digits, exactly `digits` of them. */
bool readHex(const Field& field, uint8_t digits, uint32_t& value);
/** A stamp (SPEC 2.3). */
bool readStamp(const Field& field, uint32_t& seconds, uint32_t& micros);
bool isWord(const Field& field);
/** Whether the field is this word in program memory. */
bool isThis(const Field& field, const char* word);
/** The place of the field in a list of words, or `count`. */
uint8_t indexOf(const Field& field, const char* words, uint8_t count);
/** A byte that a line may have (SPEC 1.3). */
bool allowed(char byte);

}  // namespace core
