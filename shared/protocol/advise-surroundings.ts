import { formatDuration } from '../lib/format-duration';
import { formatClock } from '../lib/format-time';
import type { Quantity, RigDocument } from '../rig/document';
import type { RoomHours } from '../schedule/plan';
import { againstRoom } from '../schedule/room';
import type { ProtocolDocument } from './document';
import type { Finding } from './finding';
import { nextOccurrenceUtcMs } from './local-time';
import { walkSteps } from './step-path';
import { waitOf } from './wait';

/** What stands around a protocol and a rig; what is not known is left out, and nothing is said of it. */
export interface Surroundings {
  room?: RoomHours;
  massSets?: readonly { sources: Pick<RigDocument['sources'], 'shape'> }[];
  /** All revisions of the rig, newest first. */
  revisions?: readonly { number: number; document: RigDocument }[];
  /** Those of the rig that fill by themselves. */
  channels?: readonly { name: string; role: string }[];
}

interface Night {
  protocol: ProtocolDocument;
  startUtcMs: number;
  endUtcMs: number;
  timeZone: string;
  /** Whether near and far are compared. */
  reverses: boolean;
}

/** Advice that needs more than protocol and rig: `late-finish`, `no-control`, `stale-calibration`, `waits-in-vain`. */
export function adviseSurroundings({ room, massSets, revisions, channels }: Surroundings, night: Night): Finding[] {
  return [
    ...(room === undefined ? [] : lateFinish(room, night)),
    ...(massSets === undefined || !night.reverses ? [] : noControl(massSets)),
    ...(revisions === undefined ? [] : staleCalibration(revisions)),
    ...(channels === undefined ? [] : waitsInVain(channels, night.protocol)),
  ];
}

const advice = (code: string, message: string): Finding[] => [{ code, path: null, message }];

/** A night that begins within the window and leaves it; one that begins outside it is refused when it is scheduled. */
function lateFinish({ nightWindow }: RoomHours, { startUtcMs, endUtcMs, timeZone }: Night): Finding[] {
  const begin = { startUtcMs, endUtcMs: startUtcMs + 1000 };
  if (nightWindow === null || againstRoom({ nightWindow, blackouts: [] }, begin, timeZone) !== null) return [];
  const closesUtcMs = nextOccurrenceUtcMs({ localTime: nightWindow.until, timeZone, utcMs: startUtcMs + 1000 });
  if (endUtcMs <= closesUtcMs) return [];
  const late = formatDuration((endUtcMs - closesUtcMs) / 1000);
  return advice(
    'late-finish',
    `It would end at ${formatClock(endUtcMs, { timeZone })}, ${late} after the night window of the room (${nightWindow.from} to ${nightWindow.until}). ` +
      `Start it ${late} earlier where the window allows that, or plan fewer passes.`,
  );
}

function noControl(massSets: NonNullable<Surroundings['massSets']>): Finding[] {
  if (massSets.length === 0 || massSets.some(({ sources }) => sources.shape === 'none')) return [];
  const sets =
    massSets.length === 1 ? 'The only mass set of this rig is loaded' : `All ${massSets.length} mass sets of this rig are loaded`;
  return advice(
    'no-control',
    `${sets}, so nothing can show how much of near − far comes from what is not attraction (heat, tilt, magnetism, draughts). ` +
      'Add an empty mass set of the same shape and heat to the rig, and run the same steps with it.',
  );
}

/** Steps that wait for what nothing of the rig measures; the start checks would refuse the run. */
function waitsInVain(channels: NonNullable<Surroundings['channels']>, { steps }: ProtocolDocument): Finding[] {
  const there = channels.map(({ name }) => name).join(', ');
  const others = there === '' ? 'none fills yet' : `filled are: ${there}`;
  return [...walkSteps(steps)].flatMap(({ step, path }) => {
    const wait = waitOf(step);
    if (wait === null || channels.some(({ name, role }) => (wait.channel === null ? role === 'deflection' : name === wait.channel)))
      return [];
    const what = wait.channel === null ? 'the deflection' : `the channel "${wait.channel}"`;
    const message =
      `This step waits for ${what}, which no device of this rig fills (${others}), so it would wait in vain for ${formatDuration(wait.atMostS)}. ` +
      `Let a device fill it, ${wait.channel === null ? 'or settle for a fixed time' : 'or wait for another channel'}.`;
    return [{ code: 'waits-in-vain', path, message }];
  });
}

/** Figures of documents are as they were typed, so the same figure is the same number. */
const differs = (a: number | undefined, b: number | undefined) => a !== b;

/** What each measured figure depends on. */
const dependence: { name: string; of: (rig: RigDocument) => Quantity | undefined; on: readonly ('pendulum' | 'fibre')[] }[] = [
  { name: 'measured.period_s', of: ({ measured }) => measured?.period_s, on: ['pendulum', 'fibre'] },
  { name: 'measured.decayTime_s', of: ({ measured }) => measured?.decayTime_s, on: ['pendulum', 'fibre'] },
];

/** A measured period or decay time is older than a change of the pendulum or of the fibre. */
function staleCalibration(revisions: NonNullable<Surroundings['revisions']>): Finding[] {
  const newest = revisions[0];
  if (newest === undefined) return [];
  const stale = dependence.flatMap(({ name, of, on }) => {
    const current = of(newest.document);
    if (current === undefined) return [];
    const since = revisions.findIndex(
      (_, k) => k + 1 === revisions.length || differs(of((revisions[k + 1] as (typeof revisions)[number]).document)?.value, current.value),
    );
    const changed = revisions.slice(0, since).flatMap(({ number, document }, k) => {
      const before = (revisions[k + 1] as (typeof revisions)[number]).document;
      const parts = on.flatMap((part) => changedFields(before[part], document[part]).map((field) => `${part}.${field}`));
      return parts.length === 0 ? [] : [{ number, parts }];
    });
    const last = changed[0];
    return last === undefined ? [] : [{ name, measured: revisions[since]?.number ?? 0, ...last }];
  });
  const [first] = stale;
  if (first === undefined) return [];
  const names = stale.filter(({ number }) => number === first.number).map(({ name }) => name);
  const [verb, object] = names.length === 1 ? ['stands', 'it'] : ['stand', 'them'];
  return advice(
    'stale-calibration',
    `${names.join(' and ')} ${verb} as in revision ${first.measured} of the rig, and revision ${first.number} changed ${first.parts.join(', ')} after that. ` +
      `Measure ${object} again with the sources away, or take ${object} out of the rig and let a kick tell.`,
  );
}

function changedFields(before: object | undefined, after: object | undefined): string[] {
  const fields = new Set([...Object.keys(before ?? {}), ...Object.keys(after ?? {})]);
  const valueOf = (part: object | undefined, field: string): number | undefined => {
    const quantity = (part as Record<string, unknown> | undefined)?.[field];
    return typeof quantity === 'object' && quantity !== null && 'value' in quantity ? (quantity.value as number) : undefined;
  };
  return [...fields].filter((field) => differs(valueOf(before, field), valueOf(after, field)));
}
