/** The order that is being carried out, shared by `motion.cpp`, `acceptance.cpp` and `homing.cpp` alone. */
#pragma once
#include "motion.hpp"
#include "stepper.hpp"

namespace core {
namespace motion {

/** Of a timed start: `armed` until the interrupt has decided. */
enum class Launch : uint8_t { none, armed, begun, refused };
enum class Homing : uint8_t { search, past, below, edge };

struct Active {
  State state;
  Order order;
  Launch launch;
  Homing homing;
  Cause cause;
  uint32_t tag;
  /** Tick of the first step. */
  Tick begin;
  /** Where it begins and ends, in counts. */
  int32_t from;
  int32_t target;
  /** While homing: the count at the edge, and whether the last approach met it. */
  int32_t edge;
  bool edgeMet;
};

struct Body {
  Limits limits;
  bool known;
  bool driversOn;
  bool warningDue;
  bool ended;
  bool freeAtRest;
  bool leaseLive;
  bool warningOn;
  bool anyTag;
  Fault fault;
  uint32_t lastTag;
  Tick leaseUntil;
  Tick warningUntil;
};

/** Between switching the drivers on and the first step: their power stage settles. */
constexpr Tick SETTLE = hal::TICKS_PER_SECOND / 50;

extern Active active;
extern Body body;

/** Motion begins: event, state, drivers. */
void begun(Tick at);
/** The order is over and the table stands still. */
void finish(Cause cause, Tick at);
void switchDriversOn();
/** `home` and `nudge` begin now. */
void beginByItself();
/** The first leg of homing, and what follows it. */
void beginSearch();
void homingLegOver();
void homingEdge(int32_t raw);
/** What the launch test finds, `done` when nothing. Also in an interrupt. */
Cause hindrance(uint8_t levels, Tick at);

}  // namespace motion
}  // namespace core
