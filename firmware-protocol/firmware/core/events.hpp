/** The numbered events and their ring (SPEC 7). */
#pragma once
#include "clock.hpp"
#include "protocol.hpp"

namespace core {
namespace events {

void start();
/** Notes what happened at `at`. What `tag`, `place` and `which` mean depends on the kind; see `compose`. */
void note(Kind kind, Tick at, uint32_t tag = 0, int32_t place = NO_PLACE, uint8_t which = 0);
/** Number of the newest event; 0 before the first. */
uint32_t newest();
/** Number of the oldest one kept. */
uint32_t oldest();
/** Sends kept events again, at most eight, as soon as the line has room (SPEC 7.4). */
void sendAgain(uint32_t from);
/** Sends one event when one is due and nothing else waits in the line. True when more may be due. */
bool sendNext();

}  // namespace events
}  // namespace core
