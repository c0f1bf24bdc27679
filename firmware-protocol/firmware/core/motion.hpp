/** What the table is doing for one order: waiting, moving, homing, braking (SPEC 8 to 11, 13). */
#pragma once
#include "protocol.hpp"
#include "request.hpp"

namespace core {
namespace motion {

/** Numbers of the faults that the controller can find in itself (SPEC 12, `fault`). */
enum class Fault : uint8_t { none, count, stack };

void start(const Limits& limits);
State state();
/** Counted position, `NO_PLACE` while it is unknown. */
int32_t place();
bool known();
bool driversOn();
bool warningDue();
/** SPEC 9.2: a stop ended the motion of this session. */
bool ended();
Fault fault();
const Limits& limits();
void setLimits(const Limits& limits);

/** SPEC 3.8: the tag of the last order accepted since the start. */
bool isRepeat(uint32_t tag);
/** The tests of SPEC 12.2 from `repeat` on, in their order; then the order is accepted. `detail` belongs to the refusal. */
Code order(const Request& request, uint32_t& detail);

/** SPEC 10. */
void renewLease(Tick received);
void endLease();
bool leaseLive();

/** SPEC 9.1, 9.2, 10.2, 11.1: cancels what waits, decelerates what moves; `steep`: with the acceleration cap. */
void brake(Cause cause, bool steep);
/** SPEC 9.3 and 11.2: pulses have ended or end at once, drivers off, position unknown. */
void cutOff(Cause cause, Tick at);
void interlockOpened();
void stop(bool free);
/** SPEC 3.9: a new session cancels what waits, and may move again. */
void newSession();
/** SPEC 11.4. `place`: the count at the edge. */
void passEdge(Tick at, int32_t place, bool uncovered);
void fail(Fault fault);

/** Tells that a timed motion has begun; before the inputs tell what its first step did to them. */
void noticeBeginning(Tick now);
/** Lets everything happen that is due. */
void poll(Tick now);
/** In the interrupt that `hal::armTest` ordered: the tests of SPEC 8.2, just before the first step. */
void test();

}  // namespace motion
}  // namespace core
