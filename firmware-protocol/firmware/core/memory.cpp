#include "memory.hpp"

#include "crc.hpp"

namespace core {
namespace memory {

namespace {

/** A number that only grows is its own order of age: the greatest valid one counts. */
struct Number {
  uint32_t value;
  uint16_t check;
};

/** `age` goes up by one with each record, modulo 65536. */
struct Taught {
  Limits limits;
  uint16_t age;
  uint16_t check;
};

/** Bytes of a slot of numbers; many slots, because each start and each new driver writes one (100 000 writes a byte). */
constexpr uint8_t NUMBER_SLOT = 8;
constexpr uint8_t NUMBER_SLOTS = 16;
constexpr uint16_t BOOT_AT = 0;
constexpr uint16_t EPOCH_AT = BOOT_AT + NUMBER_SLOT * NUMBER_SLOTS;
constexpr uint16_t TAUGHT_AT = EPOCH_AT + NUMBER_SLOT * NUMBER_SLOTS;
constexpr uint8_t TAUGHT_SLOT = 24;
constexpr uint8_t TAUGHT_SLOTS = 2;
constexpr uint8_t NUMBER_BYTES = 6;
static_assert(sizeof(Taught) == TAUGHT_SLOT, "layout in non-volatile memory");
static_assert(TAUGHT_AT + TAUGHT_SLOT * TAUGHT_SLOTS <= 1024, "the board has 1024 bytes");
static_assert(sizeof(Number) >= NUMBER_BYTES, "a number and its check");

/** A byte takes up to 4 ms. */
constexpr Tick BYTE_TICKS = hal::TICKS_PER_SECOND / 250;

struct {
  uint16_t address;
  uint8_t length;
  uint8_t done;
  uint8_t bytes[TAUGHT_SLOT];
} job;

uint32_t boots;
uint32_t epoch;
Limits taught;
uint16_t taughtAge;
uint8_t epochSlot, taughtSlot;
bool epochDirty, taughtDirty;

uint16_t checkOf(const void* record, uint8_t length) { return crcOf(static_cast<const char*>(record), length); }

void readBytes(uint16_t address, void* record, uint8_t length) {
  uint8_t* bytes = static_cast<uint8_t*>(record);
  for (uint8_t index = 0; index < length; index += 1) bytes[index] = hal::readMemory(address + index);
}

bool blank(const void* record, uint8_t length) {
  const uint8_t* bytes = static_cast<const uint8_t*>(record);
  for (uint8_t index = 0; index < length; index += 1) {
    if (bytes[index] != 0xFF) return false;
  }
  return true;
}

struct Found {
  uint32_t value;
  /** Where the next record goes. */
  uint8_t next;
  uint8_t damaged;
};

Found greatest(uint16_t at) {
  Found found = {0, 0, 0};
  for (uint8_t slot = 0; slot < NUMBER_SLOTS; slot += 1) {
    Number number;
    readBytes(at + slot * NUMBER_SLOT, &number, NUMBER_BYTES);
    if (number.check != checkOf(&number.value, sizeof number.value)) {
      if (!blank(&number, NUMBER_BYTES)) found.damaged += 1;
    } else if (number.value >= found.value) {
      found.value = number.value;
      found.next = static_cast<uint8_t>((slot + 1) % NUMBER_SLOTS);
    }
  }
  return found;
}

void readTaught() {
  taught = UNTAUGHT;
  taughtAge = 0;
  taughtSlot = 0;
  bool any = false;
  for (uint8_t slot = 0; slot < TAUGHT_SLOTS; slot += 1) {
    Taught record;
    readBytes(TAUGHT_AT + slot * TAUGHT_SLOT, &record, sizeof record);
    if (record.check != checkOf(&record, sizeof record - sizeof record.check)) continue;
    if (any && static_cast<int16_t>(record.age - taughtAge) < 0) continue;
    any = true;
    taught = record.limits;
    taughtAge = record.age;
    taughtSlot = static_cast<uint8_t>((slot + 1) % TAUGHT_SLOTS);
  }
}

void begin(uint16_t address, const void* record, uint8_t length) {
  const uint8_t* bytes = static_cast<const uint8_t*>(record);
  for (uint8_t index = 0; index < length; index += 1) job.bytes[index] = bytes[index];
  job.address = address;
  job.length = length;
  job.done = 0;
}

void beginNumber(uint16_t at, uint8_t slot, uint32_t value) {
  Number number;
  number.value = value;
  number.check = checkOf(&value, sizeof value);
  begin(at + slot * NUMBER_SLOT, &number, NUMBER_BYTES);
}

void beginTaught() {
  taughtAge += 1;
  Taught record;
  record.limits = taught;
  record.age = taughtAge;
  record.check = checkOf(&record, sizeof record - sizeof record.check);
  begin(TAUGHT_AT + taughtSlot * TAUGHT_SLOT, &record, sizeof record);
  taughtSlot = static_cast<uint8_t>((taughtSlot + 1) % TAUGHT_SLOTS);
}

/** What is to be written next, as it is now. */
bool beginNext() {
  if (epochDirty) {
    epochDirty = false;
    beginNumber(EPOCH_AT, epochSlot, epoch);
    epochSlot = static_cast<uint8_t>((epochSlot + 1) % NUMBER_SLOTS);
    return true;
  }
  if (taughtDirty) {
    taughtDirty = false;
    beginTaught();
    return true;
  }
  return false;
}

/** Equal bytes are not written again: that spares memory and time. */
void writeOne() {
  const uint16_t address = job.address + job.done;
  const uint8_t byte = job.bytes[job.done];
  job.done += 1;
  if (hal::readMemory(address) != byte) hal::writeMemory(address, byte);
}

}  // namespace

void start() {
  job.length = job.done = 0;
  epochDirty = taughtDirty = false;
  const Found boot = greatest(BOOT_AT);
  // A damaged slot may have held a later start: its identifier must not come again (SPEC 3.1).
  boots = boot.value + 1 + boot.damaged;
  const Found highest = greatest(EPOCH_AT);
  epoch = highest.value;
  epochSlot = highest.next;
  readTaught();
  beginNumber(BOOT_AT, boot.next, boots);
  while (job.done < job.length || hal::memoryBusy()) {
    if (!hal::memoryBusy()) writeOne();
  }
}

uint32_t bootCount() { return boots; }
uint32_t highestEpoch() { return epoch; }
const Limits& limits() { return taught; }

void setHighestEpoch(uint32_t value) {
  if (value == epoch) return;
  epoch = value;
  epochDirty = true;
}

void setLimits(const Limits& limits) {
  taught = limits;
  taughtDirty = true;
}

bool poll(Tick now) {
  if (job.done == job.length && !beginNext()) return false;
  if (hal::memoryBusy())
    hal::wakeAt(now + BYTE_TICKS);
  else
    writeOne();
  return true;
}

}  // namespace memory
}  // namespace core
