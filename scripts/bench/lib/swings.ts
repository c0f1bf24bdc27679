import { demoIds } from '@/db/demo/seed';
import type { ChainedEvent } from '@/shared/archive/run-records';
import type { ProtocolDocument } from '@/shared/protocol/document';
import type { LabClient } from './lab-client';

/** Swings and dwells of so many seconds for an hour and more, carried on by themselves after whatever may be. */
export const swingsWith = (dwellS: number): ProtocolDocument => ({
  formatVersion: 1,
  name: 'Swings',
  onInterruption: 'resume',
  steps: [
    { kind: 'home' },
    {
      kind: 'repeat',
      times: 500,
      steps: [
        { kind: 'swing', to: 'near' },
        { kind: 'dwell', for_s: dwellS },
        { kind: 'swing', to: 'far' },
        { kind: 'dwell', for_s: dwellS },
      ],
    },
  ],
});

export const swings = swingsWith(3);

/** The whole log of a run. */
export async function eventsOf(lab: LabClient, runId: string): Promise<ChainedEvent[]> {
  const events: ChainedEvent[] = [];
  for (let cursor: string | null = ''; cursor !== null;) {
    const after: string = cursor === '' ? '' : `&cursor=${encodeURIComponent(cursor)}`;
    const page = (await lab.read(`/labs/${demoIds.lab}/runs/${runId}/events?limit=500${after}`)).body as {
      items: ChainedEvent[];
      next: string | null;
    };
    events.push(...page.items);
    cursor = page.next;
  }
  return events;
}
