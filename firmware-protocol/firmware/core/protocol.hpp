/** Numbers of SPEC.md, and the words of it that are told by an index. */
#pragma once
#include "../hal/flash.hpp"
#include "../hal/hal.hpp"

namespace core {

using hal::Tick;

constexpr uint8_t MAX_LINE = 96;                                    // SPEC 1.2
constexpr uint8_t MAJOR = 1, MINOR = 0;
constexpr int32_t GREATEST_POSITION = 9999999;                      // SPEC 2.4
constexpr uint32_t GREATEST_RATE = 99999999;                        // SPEC 2.4
constexpr uint32_t LEASE_TICKS = 2 * hal::TICKS_PER_SECOND;         // SPEC 10.1
constexpr uint32_t WARNING_MS = 10000;                              // SPEC 11.6
constexpr uint32_t WARNING_TICKS = 10 * hal::TICKS_PER_SECOND;
constexpr uint32_t FURTHEST_MS = 60000;                             // SPEC 8.2
constexpr uint32_t FURTHEST_TICKS = 60 * hal::TICKS_PER_SECOND;
constexpr uint32_t EVENT_RING = 32;                                 // SPEC 7.3
constexpr uint8_t EVENTS_AT_ONCE = 8;                               // SPEC 7.4
constexpr uint8_t RESOLUTION_US = 1;                                // SPEC 5.5
constexpr uint16_t CAPABILITIES = 0x003F;                           // SPEC 5.5
/** SPEC 8.10: the most this controller can do: an interval leaves room for the interrupt that plans the next one. */
constexpr uint32_t GREATEST_SPEED = 8000000;
constexpr uint32_t GREATEST_ACCELERATION = GREATEST_RATE;
/** No position (`none`). */
constexpr int32_t NO_PLACE = INT32_MIN;

/** SPEC 5.4. */
enum class State : uint8_t { rest, waiting, moving, homing, braking, fault };

/** SPEC 7.1, in the order of `EVENT_WORDS`. */
enum class Kind : uint8_t { boot, warn, began, ended, homed, edge, interlock, supply, key, lease, limit };

/** SPEC 7.2, in the order of `CAUSE_WORDS`. */
enum class Cause : uint8_t { done, hold, stop, off, interlock, supply, lease, limit, session, search, fault };

/** SPEC 12, in the order of `REFUSAL_WORDS`; `none` is no refusal. */
enum class Code : uint8_t {
  none, word, field, epoch, session, old, reused, repeat, busy, stopped, key, lease, interlock, supply, unknown, travel, speed, ramp,
  past, far, warning, flag, gone, fault
};

/** SPEC 4, in the order of `ORDER_WORDS`. */
enum class Order : uint8_t { ident, hello, status, renew, limits, events, home, move, hold, stop, off, nudge, teach, unknown };

/** Words one after the other, each closed by a zero byte. */
extern const char ORDER_WORDS[] FLASH;
extern const char STATE_WORDS[] FLASH;
extern const char EVENT_WORDS[] FLASH;
extern const char CAUSE_WORDS[] FLASH;
extern const char REFUSAL_WORDS[] FLASH;
extern const char BOOT_WORDS[] FLASH;
extern const char LEVEL_WORDS[] FLASH;
extern const char FIRMWARE[] FLASH;

/** The word number `index` of such a list. */
const char* nth(const char* words, uint8_t index);

/** SPEC 5.6. */
struct Limits {
  int32_t least;
  int32_t greatest;
  uint32_t speed;
  uint32_t acceleration;
  uint32_t home;
};
static_assert(sizeof(Limits) == 20, "five numbers of 32 bits: the layout in non-volatile memory");

/** SPEC 8.11: a short and slow travel on any rig. */
constexpr Limits UNTAUGHT = {-3600, 3600, 200000, 200000, 100000};

}  // namespace core
