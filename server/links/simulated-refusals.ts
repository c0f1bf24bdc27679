import {
  FURTHEST_BEGIN_MS,
  longestNudge,
  WARNING_MS,
  type Limits,
  type MoveOrder,
  type NoBody,
  type Order,
  type RefusalCode,
  type TeachOrder,
} from '@/firmware-protocol/codec';
import type { MachineFacts } from './simulated-report';

export type MotionOrder = MoveOrder | Extract<Order, { word: 'home' | 'nudge' }>;

/** What the simulated motor can do: the reference board's rate of steps, and the greatest number there is. */
const CEILING = { speed: 8_000_000, acceleration: 99_999_999 };

/** What an order to move is tested against. */
export interface Circumstances extends MachineFacts {
  limits: Limits;
  /** Tag of the last order accepted. */
  lastTag: string | null;
  /** The order's time of beginning less now, ms; null for now. */
  aheadMs: number | null;
}

export const no = (code: RefusalCode, detail = 0): NoBody => ({ word: 'no', code, detail });

/** The tests of SPEC 12.2, in its order; null when the order is accepted. */
export function refusalOf(order: MotionOrder, now: Circumstances): NoBody | null {
  if (order.tag === now.lastTag) return no('repeat');
  if (now.state !== 'rest') return no('busy');
  if (now.motionEnded) return no('stopped');
  if (order.word === 'nudge' && !now.armKey) return no('key');
  if (!now.interlockClosed) return no('interlock');
  if (!now.supplyPresent) return no('supply');
  if (order.word === 'move' && !now.positionKnown) return no('unknown');
  if (!now.leaseLive) return no('lease');
  if (order.word === 'nudge') return nudgeRefusal(order.steps, now);
  return order.word === 'move' ? moveRefusal(order, now) : null;
}

/** SPEC 8.10; what is wrong in itself is refused by the codec. */
export function teachRefusal({ speed, acceleration }: TeachOrder, { state, armKey }: MachineFacts): NoBody | null {
  if (state !== 'rest') return no('busy');
  if (!armKey) return no('key');
  if (speed > CEILING.speed) return no('speed', CEILING.speed);
  return acceleration > CEILING.acceleration ? no('ramp', CEILING.acceleration) : null;
}

/** SPEC 8.9. */
function nudgeRefusal(steps: number, { limits }: Circumstances): NoBody | null {
  const longest = longestNudge(limits);
  return steps === 0 || Math.abs(steps) > longest ? no('travel', longest) : null;
}

function moveRefusal(order: MoveOrder, { limits, aheadMs, warningDue }: Circumstances): NoBody | null {
  if (order.position < limits.least) return no('travel', limits.least);
  if (order.position > limits.greatest) return no('travel', limits.greatest);
  if (order.speed > limits.speed) return no('speed', limits.speed);
  if (order.acceleration > limits.acceleration) return no('ramp', limits.acceleration);
  if (aheadMs === null) return null;
  if (aheadMs < 0) return no('past', Math.min(Math.ceil(-aheadMs), 0xffffffff));
  if (aheadMs > FURTHEST_BEGIN_MS) return no('far', FURTHEST_BEGIN_MS);
  return warningDue && aheadMs < WARNING_MS ? no('warning', WARNING_MS) : null;
}
