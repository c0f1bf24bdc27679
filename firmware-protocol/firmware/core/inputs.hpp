/** Interlock, supply, arm key and home flag (SPEC 11): noticed in an interrupt, told by the main loop. */
#pragma once
#include "protocol.hpp"

namespace core {
namespace inputs {

void start(Tick now);
/** In the interrupt of the inputs. Supply lost: pulses end here and now (SPEC 11.2). */
void changed(Tick at);
/** Tells what was noticed, in order. */
void tell();
/** Levels as told so far, `hal::FLAG_COVERED` and so on. */
uint8_t levels();
/** Levels as they are now, with every contact open that was open a moment ago. Also in interrupts. */
uint8_t safest();
inline bool covered() { return (levels() & hal::FLAG_COVERED) != 0; }
inline bool interlockClosed() { return (levels() & hal::INTERLOCK_CLOSED) != 0; }
inline bool supplyPresent() { return (levels() & hal::SUPPLY_PRESENT) != 0; }
inline bool keyOn() { return (levels() & hal::KEY_ON) != 0; }

}  // namespace inputs
}  // namespace core
