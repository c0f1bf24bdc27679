import type { PassOrder } from '@/shared/protocol/shuffle';
import type { Draft } from './draft';

/** More passes than these never begin with one step. */
const MOST_NESTED = 8;

/** The log says in which order the children of a pass come, before the first of them is ordered; once, however often it is asked. */
export function noteOrders(draft: Draft, drawn: readonly PassOrder[] = []): void {
  const { context } = draft;
  for (const { path, order } of drawn) {
    const told = context.ordersTold ?? [];
    if (told.includes(path)) continue;
    context.ordersTold = [...told, path].slice(-MOST_NESTED);
    draft.log('order-drawn', { path, order });
  }
}
