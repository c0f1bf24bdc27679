import { appendEvent, type ChainHead, type Sha256 } from '@/shared/archive/chain';
import type { ChainedEvent } from '@/shared/archive/run-records';
import type { Happening } from './run-context';

/** What happened, as the links of the event chain that follow `head`. */
export function chained(happenings: readonly Happening[], head: ChainHead, sha256: Sha256): ChainedEvent[] {
  let last = head;
  return happenings.map(({ at, kind, data }) => {
    const event = appendEvent(last, { at: new Date(at.utcMs).toISOString(), kind, data }, sha256);
    last = event;
    return event;
  });
}
