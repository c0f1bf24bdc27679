import type { PassOrder } from '@/shared/protocol/shuffle';
import type { Draft } from './draft';

/** At least so many passes are remembered: more never go on at once, but marks alone may begin many before the next step. */
const REMEMBERED = 8;

/** The log says in which order the children of a pass come, before the first of them is ordered; once, however often it is asked. */
export function noteOrders(draft: Draft, drawn: readonly PassOrder[] = []): void {
  const { context } = draft;
  const fresh = drawn.filter(({ path }) => context.ordersTold?.includes(path) !== true);
  if (fresh.length === 0) return;
  // All that was told at once may be asked for once more, each by itself, before the move that followed.
  context.ordersTold = [...(context.ordersTold ?? []), ...fresh.map(({ path }) => path)].slice(-Math.max(REMEMBERED, fresh.length));
  for (const { path, order } of fresh) draft.log('order-drawn', { path, order });
}
