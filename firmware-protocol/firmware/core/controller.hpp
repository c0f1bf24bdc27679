/** The controller as a whole: requests in, replies and events out (SPEC 4, 5). */
#pragma once
#include "intake.hpp"

namespace core {
namespace controller {

/** Filled by the receive interrupt. */
extern Intake intake;

/** After a reset; the clock stands at 0. */
void start(hal::BootCause cause);
/** One turn of the main loop. False when nothing is left to do until the next interrupt. */
bool turn();
/** Something is wrong with the controller itself: drivers off, everything refused (SPEC 13). `number`: see `motion::Fault`. */
void fail(uint8_t number);

}  // namespace controller
}  // namespace core
