import { FURTHEST_BEGIN_MS, WARNING_MS, type LimitsBody, type MoveOrder, type NoBody, type RefusalCode } from '@/firmware-protocol/codec';
import type { MachineFacts } from './simulated-report';

/** What an order to move is tested against. */
export interface Circumstances extends MachineFacts {
  limits: Omit<LimitsBody, 'word'>;
  /** Tag of the last order accepted. */
  lastTag: string | null;
  /** The order's time of beginning less now, ms; null for now. */
  aheadMs: number | null;
}

export const no = (code: RefusalCode, detail = 0): NoBody => ({ word: 'no', code, detail });

/** The tests of SPEC 12.2, in its order; null when the order is accepted. */
export function refusalOf(order: MoveOrder | { word: 'home'; tag: string }, now: Circumstances): NoBody | null {
  if (order.tag === now.lastTag) return no('repeat');
  if (now.state !== 'rest') return no('busy');
  if (now.motionEnded) return no('stopped');
  if (!now.interlockClosed) return no('interlock');
  if (!now.supplyPresent) return no('supply');
  if (order.word === 'move' && !now.positionKnown) return no('unknown');
  if (!now.leaseLive) return no('lease');
  return order.word === 'move' ? moveRefusal(order, now) : null;
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
