import { readFileSync } from 'node:fs';
import { join } from 'node:path';
import * as fc from 'fast-check';
import { verifyChain } from '@/shared/archive/chain';
import type { InterruptionPolicy, Step } from '@/shared/protocol/document';
import { sha256Hex } from '@/server/evaluation/sha256';
import type { Rehearsal } from '@/server/engine/rehearsal/rehearse';
import { runThrough, shortProtocol, startUtcMs } from './rehearsing';

const policies: InterruptionPolicy[] = ['hold', 'resume', 'stop'];
const faults = ['link-drop', 'garbage', 'server-kill', 'controller-reset', 'interlock-open', 'sensor-gap', 'burst'] as const;
type Fault = (typeof faults)[number];

/** The table that users read: what a run comes to, at whatever second the fault comes. */
const rows = readFileSync(join(__dirname, '../../docs/faults.md'), 'utf8').matchAll(/^\| `([\w-]+)` \|.*\| (\w+) \| (\w+) \| (\w+) \|$/gm);
const table = Object.fromEntries([...rows].map(([, fault, hold, resume, stop]) => [fault, { hold, resume, stop }])) as Record<
  Fault,
  Record<InterruptionPolicy, string>
>;

test('the table names every fault', () => {
  expect(Object.keys(table)).toEqual(faults);
});

function assertWholeLog({ steps, events }: Rehearsal): void {
  expect(steps.map(({ seq }) => seq)).toEqual(steps.map((_, index) => index + 1));
  expect(steps.filter(({ outcome, endUtcMs }) => outcome === null || endUtcMs === null)).toEqual([]);
  for (const { startUtcMs, endUtcMs } of steps) expect(endUtcMs ?? 0).toBeGreaterThanOrEqual(startUtcMs - 0.01);
  expect(verifyChain(events, sha256Hex)).toMatchObject({ valid: true, events: events.length });
}

const whole = runThrough(shortProtocol);

test('without a fault the run finishes, every row done', async () => {
  const { outcome, steps, holds } = await whole;
  expect({ outcome, holds }).toEqual({ outcome: 'finished', holds: 0 });
  expect(steps.filter((step) => step.outcome !== 'done')).toEqual([]);
});

const seconds = [0, 0.4, 3, 9, 20, 46.8, 47.9, 50, 56.5, 97, 130, 200];
const cells = faults.flatMap((kind) => policies.map((onInterruption) => ({ kind, onInterruption, outcome: table[kind][onInterruption] })));

test.each(cells)('$kind under $onInterruption: $outcome', async ({ kind, onInterruption, outcome }) => {
  for (const atS of seconds) {
    const result = await runThrough({ ...shortProtocol, onInterruption }, { faults: [{ kind, atS }] });
    expect({ atS, outcome: result.outcome, reason: result.facts.reason }).toMatchObject({ atS, outcome });
    expect(result.holds).toBe(outcome === 'held' ? 1 : 0);
    assertWholeLog(result);
  }
});

test('under resume a swing that the fault broke is finished first, its row says late, and the cadence starts anew', async () => {
  for (const kind of ['link-drop', 'server-kill'] as const) {
    const { steps } = await runThrough({ ...shortProtocol, onInterruption: 'resume' }, { faults: [{ kind, atS: 49.5 }] });
    const late = steps.findIndex(({ outcome }) => outcome === 'late');
    expect(steps[late - 1]).toMatchObject({ kind: 'swing', outcome: 'cut short', station: '' });
    expect(steps[late]).toMatchObject({
      kind: 'swing',
      path: steps[late - 1]?.path,
      station: 'far',
      angleStartDeg: steps[late - 1]?.angleEndDeg,
    });
    const dwell = steps[late + 1];
    expect(dwell).toMatchObject({ kind: 'dwell', outcome: 'done', startUtcMs: steps[late]?.endUtcMs });
    expect((dwell?.endUtcMs ?? 0) - (dwell?.startUtcMs ?? 0)).toBeCloseTo(40_000, 6);
  }
});

test('a gap of the sensor leaves no sample for 120 s, a burst shakes them by up to 200 µrad for 60 s, and neither touches the rest', async () => {
  const samplesOf = async (kind: 'sensor-gap' | 'burst') => {
    const { channels } = await runThrough(shortProtocol, { faults: [{ kind, atS: 60 }] });
    return channels[0] as Rehearsal['channels'][0];
  };
  const [calm, gap, burst] = [
    (await whole).channels[0] as Rehearsal['channels'][0],
    await samplesOf('sensor-gap'),
    await samplesOf('burst'),
  ];
  const since = (utcMs: number) => (utcMs - startUtcMs) / 1000;
  const truth = new Map([...calm.utcMs].map((utcMs, index) => [utcMs, calm.value[index] as number]));
  expect([...calm.utcMs].filter((utcMs) => !gap.utcMs.includes(utcMs)).map((utcMs) => Math.floor(since(utcMs)))).toEqual(
    Array.from({ length: 120 }, (_, index) => 60 + index),
  );
  expect([...gap.utcMs].every((utcMs, index) => gap.value[index] === truth.get(utcMs))).toBe(true);
  const off = [...burst.utcMs].map((utcMs, index) => ({
    atS: since(utcMs),
    rad: (burst.value[index] as number) - (truth.get(utcMs) ?? 0),
  }));
  expect(off.filter(({ atS, rad }) => rad !== 0 && (atS < 60 || atS >= 120))).toEqual([]);
  const greatest = Math.max(...off.map(({ rad }) => Math.abs(rad)));
  expect(greatest).toBeGreaterThan(150e-6);
  expect(greatest).toBeLessThanOrEqual(200e-6);
});

test.each(['sensor-gap', 'burst'] as const)(
  '%s: the dwell it falls into is not good, with the reason in the log, and the others are',
  async (kind) => {
    const reversal = (to: string): Step[] => [
      { kind: 'swing', to },
      { kind: 'dwell', beat_periods: 1 },
    ];
    const steps: Step[] = [{ kind: 'home' }, ...['near', 'far', 'near', 'far'].flatMap(reversal)];
    const { steps: rows, events, outcome } = await runThrough({ ...shortProtocol, steps }, { faults: [{ kind, atS: 580 }] });
    expect(outcome).toBe('finished');
    expect(rows.filter((row) => row.kind === 'dwell').map(({ good }) => good)).toEqual([true, false, true, true]);
    expect(events.filter((event) => event.kind === 'dwell-not-good').map(({ data }) => String(data['why']))).toEqual([
      expect.stringMatching(
        kind === 'burst' ? /^deflection off its fit by up to (1|2)\d\d µrad for 3\d s/ : /^deflection silent for 12\d s/,
      ),
    ]);
  },
);

test('the log says for how long nobody drove the run', async () => {
  const { events } = await runThrough({ ...shortProtocol, onInterruption: 'resume' }, { faults: [{ kind: 'link-drop', atS: 20 }] });
  const kinds = events.map(({ kind }) => kind);
  expect(kinds).toEqual(expect.arrayContaining(['link-lost', 'link-ready', 'resumed']));
  const gapS = Number(events.find(({ kind, data }) => kind === 'link-ready' && Number(data['gapS']) > 0)?.data['gapS']);
  expect(gapS).toBeGreaterThan(20);
  expect(gapS).toBeLessThan(30);
});

test('any fault at any second, also two of them, comes to an end that the table allows, with a whole log', async () => {
  // A line counts as lost after 5 s: what comes later than that before the end finds the run over.
  const end = (await whole).simulatedS - 5.5;
  await fc.assert(
    fc.asyncProperty(
      fc.constantFrom(...policies),
      fc.array(fc.record({ kind: fc.constantFrom(...faults), atS: fc.double({ min: 0, max: end, noNaN: true }) }), {
        minLength: 1,
        maxLength: 2,
      }),
      async (onInterruption, raised) => {
        const result = await runThrough({ ...shortProtocol, onInterruption }, { faults: raised, rateHz: 0.1 });
        assertWholeLog(result);
        const allowed = raised.map(({ kind }) => table[kind][onInterruption]);
        if (raised.length === 1) expect({ outcome: result.outcome }).toEqual({ outcome: allowed[0] });
        else expect([...allowed, 'held', 'finished']).toContain(result.outcome);
      },
    ),
    { numRuns: 100 },
  );
}, 60_000);
