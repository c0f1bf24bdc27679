/** Received bytes become lines, in the receive interrupt. */
#pragma once
#include "protocol.hpp"

namespace core {

/** A received line without its line feed. */
struct Line {
  Tick received;
  /** One more than fits: the line is too long (SPEC 1.6). */
  uint8_t length;
  char text[MAX_LINE];
};

/**
 * A few lines in a circle: the interrupt fills, the main loop empties. With a request in flight and a stop after it
 * (SPEC 3.5) two are waiting at most; one is being filled.
 */
class Intake {
 public:
  static constexpr uint8_t LINES = 3;
  static constexpr uint8_t TOO_LONG = MAX_LINE + 1;

  /** In the interrupt: one byte, and when it came. */
  void take(uint8_t byte, Tick at) {
    Line& line = lines_[filling_];
    if (byte == '\n') {
      line.received = at;
      close(line);
    } else if (line.length < MAX_LINE) {
      line.text[line.length] = static_cast<char>(byte);
      line.length += 1;
    } else {
      line.length = TOO_LONG;
    }
  }

  bool ready() const { return *const_cast<const volatile uint8_t*>(&filling_) != emptying_; }
  /** The oldest line; only when `ready`. */
  Line& first() { return lines_[emptying_]; }
  void release() {
    lines_[emptying_].length = 0;
    *const_cast<volatile uint8_t*>(&emptying_) = after(emptying_);
  }
  /** Lines for which there was no place, since the last call. Under a lock. */
  uint8_t lost() {
    const uint8_t count = lost_;
    lost_ = 0;
    return count;
  }
  void clear() {
    filling_ = emptying_ = lost_ = 0;
    for (Line& line : lines_) line.length = 0;
  }

 private:
  static uint8_t after(uint8_t index) { return index + 1 == LINES ? 0 : static_cast<uint8_t>(index + 1); }

  void close(Line& line) {
    // SPEC 1.5: an empty line is ignored without counting it.
    if (line.length == 0) return;
    if (line.length == 1 && line.text[0] == '\r') {
      line.length = 0;
      return;
    }
    if (after(filling_) == emptying_) {
      lost_ += 1;
      line.length = 0;
      return;
    }
    filling_ = after(filling_);
  }

  Line lines_[LINES];
  uint8_t filling_;
  uint8_t emptying_;
  uint8_t lost_;
};

}  // namespace core
