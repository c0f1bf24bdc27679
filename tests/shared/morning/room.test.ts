import type { StepRow } from '@/shared/archive/run-records';
import { driftOf, roomOf } from '@/shared/morning/room';
import type { EvaluationResult } from '@/shared/evaluation/result';

/** Six dwells of an hour, near and far in turn, without a pause between them. */
const rows = [0, 1, 2, 3, 4, 5].map((hour) => ({
  ...{ seq: hour + 1, kind: 'dwell' as StepRow['kind'], station: hour % 2 === 0 ? 'near' : 'far' },
  ...{ startUtcMs: hour * 3_600_000, endUtcMs: (hour + 1) * 3_600_000 },
}));
const means = (value: (hour: number, side: 1 | -1) => number) =>
  new Map(rows.map(({ seq }) => [seq, value(seq - 1, seq % 2 === 1 ? 1 : -1)]));
const channel = { name: 'temperature', unit: 'Cel', least: 20, greatest: 21 };

test('a drift of the room is not in step with the swings, what turns with them is', () => {
  const [slow] = roomOf([{ ...channel, means: means((hour) => 20 + 0.2 * hour) }], rows);
  expect(slow?.inStep?.value).toBeCloseTo(0, 12);
  const [along] = roomOf([{ ...channel, means: means((hour, side) => 20 + 0.2 * hour + 0.05 * side) }], rows);
  expect(along?.inStep?.value).toBeCloseTo(0.1, 12);
  expect(along).toMatchObject({ least: 20, greatest: 21, unit: 'Cel' });
});

test('with fewer than three dwells in which the channel has samples nothing is said', () => {
  const few = new Map([...means(() => 20)].slice(0, 2));
  expect(roomOf([{ ...channel, means: few }], rows)[0]?.inStep).toBeNull();
});

const evaluated = (theta: (hour: number) => number) =>
  ({
    dwells: rows.map(({ seq, station }) => ({
      ...{ seq, station, samples: 1, used: true, why: null },
      theta_rad: { value: theta(seq - 1) + (seq % 2 === 1 ? 1e-3 : -1e-3), u: 3e-6 },
    })),
  }) as unknown as EvaluationResult;

test('the drift at start and end, with the u of the centres it is read off', () => {
  const drift = driftOf(
    evaluated((hour) => 5e-6 * hour),
    rows,
  );
  expect(drift?.start.value).toBeCloseTo(5e-6, 15);
  expect(drift?.end.value).toBeCloseTo(5e-6, 15);
  // Two centres of 3 µrad each, two hours apart, on each of two sides: 3 √2 / 2 / √2 = 1.5 µrad/h.
  expect(drift?.start.u).toBeCloseTo(1.5e-6, 15);
  const slowing = driftOf(
    evaluated((hour) => 1e-6 * hour * (10 - hour)),
    rows,
  );
  // Means over 0 to 2 h and 1 to 3 h: 8 and 6; over 2 to 4 h and 3 to 5 h: 4 and 2 µrad/h.
  expect(slowing?.start.value).toBeCloseTo(7e-6, 15);
  expect(slowing?.end.value).toBeCloseTo(3e-6, 15);
});

test('before an evaluation there is no drift', () => {
  expect(driftOf(null, rows)).toBeNull();
});
