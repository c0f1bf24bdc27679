import type { RunStart } from '@/shared/archive/run-records';
import { advance } from './chart';
import { type Advance, CHART_VERSION, type RunEvent, type RunSnapshot } from './run-context';

/** As `advance`; a fault in the chart itself must not leave a rig in motion: the run fails and a stop goes out. */
export function advanceSafely(start: RunStart, snapshot: RunSnapshot, event: RunEvent): Advance {
  try {
    return advance(start, snapshot, event);
  } catch (error) {
    const why = error instanceof Error ? error.message : String(error);
    const reason = { code: 'defect', text: `The run engine met a fault of its own and stopped the run: ${why}` };
    const context = { ...snapshot.context, reason, endedAtUtcMs: event.at.utcMs, deadlineUtcMs: null, ahead: null };
    const id = `${start.runId}-fault-${context.commandCount}`;
    return {
      snapshot: { version: CHART_VERSION, state: 'failed', context },
      steps: [],
      events: [{ at: event.at, kind: 'failed', data: { code: reason.code, reason: reason.text } }],
      effects: [{ kind: 'link', id, command: { kind: 'stop', id, releaseDrivers: false } }],
    };
  }
}
