/** What a line says (SPEC 1, 2 and 4). */
#pragma once
#include "protocol.hpp"

namespace core {

struct Request {
  uint32_t epoch;
  uint32_t session;
  uint16_t number;
  Order order;
  /** `none`, or the refusal of SPEC 4.1: `word` or `field`. */
  Code unusable;
  /** `stop free`; `move` with a stamp. */
  bool free;
  bool timed;
  uint32_t tag;
  /** Position or steps; first event asked for; least position; version. */
  int32_t place;
  uint32_t from;
  uint32_t speed;
  uint32_t acceleration;
  uint32_t seconds;
  uint32_t micros;
  /** `teach` only. */
  int32_t greatest;
  uint32_t home;
};

/** Reads a line without its line feed; false when it must be dropped (SPEC 1.6). */
bool readRequest(const char* text, uint8_t length, Request& request);

/** Length without the carriage return of SPEC 1.5. */
inline uint8_t withoutReturn(const char* text, uint8_t length) {
  return length != 0 && length <= MAX_LINE && text[length - 1] == '\r' ? static_cast<uint8_t>(length - 1) : length;
}

}  // namespace core
