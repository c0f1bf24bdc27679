/**
 * Non-volatile memory: the count of starts (SPEC 3.1), the highest epoch (3.3), the limits (8.10). Every record has a
 * checksum and goes to another slot than the one before, so a write that is cut off leaves the older record.
 */
#pragma once
#include "protocol.hpp"

namespace core {
namespace memory {

/** Counts this start, reads the rest. Takes some 30 ms. */
void start();
uint32_t bootCount();
uint32_t highestEpoch();
const Limits& limits();
/** Takes effect at once and is written by and by. */
void setHighestEpoch(uint32_t epoch);
void setLimits(const Limits& limits);
/** Writes the next byte when one is due. True while there is something to write. */
bool poll(Tick now);

}  // namespace memory
}  // namespace core
