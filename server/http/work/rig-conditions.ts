import type { AlarmCode, Ringing } from '@/shared/alarms/catalog';
import { alarmOfHold } from '@/shared/alarms/of-holds';
import type { RunState } from '@/shared/contracts/runs';
import type { RunFacts } from '../../engine/run-facts';
import type { LinkHealth } from '../../interfaces/turntable-link';
import { dwellsSoFar, fewGoodWords, type DwellsSoFar } from './few-good';

/** A condition that holds now. */
export interface Condition {
  code: AlarmCode;
  subject: string;
  words: string;
  runId: string | null;
  rings?: Ringing;
  onDelayS?: number;
  /** Since when it holds, where that is known better than by looking. */
  sinceUtcMs?: number;
}

interface RunNow {
  id: string;
  state: RunState;
  reason: string;
  reasonCode: string;
  startedUtcMs: number | null;
  /** The last dwell was noisier than an ordinary night's; null where it was not. */
  loud: { words: string; sinceUtcMs: number } | null;
  dwells: DwellsSoFar;
  /** Of the pendulum, s; null where it is not measured. */
  periodS: number | null;
}

export const runNowOf = (
  { runId, state, reason, reasonCode, startedAtUtcMs, loud, ...facts }: RunFacts,
  periodS: number | null,
): RunNow => ({
  ...{ id: runId, state, reason, reasonCode, startedUtcMs: startedAtUtcMs, loud, periodS },
  dwells: dwellsSoFar(facts),
});

/** What is seen of a rig at one moment. */
export interface RigNow {
  utcMs: number;
  run: RunNow | null;
  /** Why an unfinished run cannot be carried on; null where there is none. */
  quarantined: { runId: string; why: string } | null;
  link: Pick<LinkHealth, 'condition' | 'detail'>;
  /** The controller has answered since the line was opened. */
  linkWasReady: boolean;
  /** Opened or lost while the rig was armed or ran, and not yet made good. */
  open: { interlock: boolean; supply: boolean };
  /** When the deflection that the run is to be evaluated by last came; null: it never did, or nothing arrives by itself. */
  deflectionUtcMs: number | null;
}

const silentMs = 60_000;
const firstAnswerS = 60;
const atRest: RunState[] = ['holding', 'held'];
const atWork: RunState[] = ['starting', 'running', ...atRest];

/** The alarms of a rig that its run, its line and its inputs give cause for. */
export function conditionsOf(now: RigNow): Condition[] {
  const { run, quarantined, link, open } = now;
  const runId = run?.id ?? null;
  const found: Condition[] = [];
  const add = (code: AlarmCode, words: string) => {
    if (!found.some((one) => one.code === code)) found.push({ code, subject: '', words, runId });
  };
  if (run !== null && atRest.includes(run.state)) {
    const code = alarmOfHold(run.reasonCode);
    // What held the run has lasted for as long as it had to.
    if (code !== null) found.push({ code, subject: '', words: run.reason, runId, onDelayS: 0 });
  }
  if (open.interlock) add('interlock', 'The interlock was opened while the rig was armed. Close it and arm the rig again on site.');
  if (open.supply) add('supply', 'The motor supply was lost while the rig was armed; the position is lost with it.');
  if (quarantined !== null) found.push({ code: 'not-taken-up', subject: '', words: quarantined.why, runId: quarantined.runId });
  if (link.condition === 'lost' || link.condition === 'refused') {
    const words = link.detail === '' ? 'The controller does not answer.' : link.detail;
    // A line that is being opened for the first time, as at the start of the server, may take a while.
    found.push({ code: 'link-lost', subject: '', words, runId, ...(now.linkWasReady ? {} : { onDelayS: firstAnswerS }) });
  }
  // What has to do with the deflection is told after a period at the earliest.
  if (run?.loud != null)
    found.push({
      code: 'residual-high',
      subject: '',
      runId,
      ...run.loud,
      ...(run.periodS === null ? {} : { onDelayS: Math.round(run.periodS) }),
    });
  const few = run === null ? null : fewGoodWords(run.dwells);
  if (few !== null) add('few-good', few);
  const silent = silentSince(now);
  if (silent !== null)
    found.push({
      code: 'deflection-silent',
      subject: '',
      words: 'No deflection arrives.',
      runId,
      sinceUtcMs: silent,
      onDelayS: silentMs / 1000,
    });
  return found;
}

/** Since when the deflection of a run is silent; null where it is not, or where none was flowing when the run began. */
function silentSince({ run, deflectionUtcMs, utcMs }: RigNow): number | null {
  if (run === null || !atWork.includes(run.state) || run.startedUtcMs === null || deflectionUtcMs === null) return null;
  const flowed = deflectionUtcMs >= run.startedUtcMs - 10 * silentMs;
  return flowed && utcMs - deflectionUtcMs > silentMs ? deflectionUtcMs : null;
}

const slow: readonly AlarmCode[] = [
  'excursion',
  'channel-level',
  'channel-slope',
  'channel-silent',
  'broker-away',
  'camera-away',
  'late-finish',
];

/** Kinds that a look can tell to be over; others end by what somebody does. */
const watched: readonly AlarmCode[] = [
  ...(['unexpected-motion', 'limit', 'interlock', 'supply', 'controller-reset', 'proof-failed', 'home-edge', 'held'] as const),
  ...(['no-response', 'no-deflection', 'not-taken-up', 'link-lost', 'deflection-silent', 'residual-high', 'few-good', 'disk-low'] as const),
  ...slow,
];

/** Kinds for which the database is looked into, which is done less often. */
export const isSlow = (code: string): boolean => (slow as readonly string[]).includes(code);
export const isWatched = (code: string): code is AlarmCode => (watched as readonly string[]).includes(code);
