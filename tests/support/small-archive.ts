import type { BuildArchiveInput } from '@/shared/archive/build-archive';
import { appendEvent, emptyChain } from '@/shared/archive/chain';
import type { StepRow } from '@/shared/archive/run-records';
import { sha256Hex } from '@/server/evaluation/sha256';
import { wideRig } from './reference-rigs';

const startUtcMs = Date.UTC(2026, 2, 1, 22, 0, 0);

function stepRow(seq: number, changes: Partial<StepRow> = {}): StepRow {
  const at = startUtcMs + seq * 100_000;
  return {
    seq,
    path: `${seq}.dwell`,
    kind: 'dwell',
    label: '',
    station: 'near',
    plannedStartUtcMs: at,
    plannedEndUtcMs: at + 90_000,
    startUtcMs: at + 0.125,
    endUtcMs: at + 90_000.5,
    uStartS: 0.001,
    uEndS: 0.001,
    angleStartDeg: 20.18,
    angleEndDeg: 20.18,
    outcome: 'done',
    angleSource: 'edge-verified',
    uAngleDeg: 0.01,
    good: true,
    ...changes,
  };
}

/** A complete archive of a few rows: enough to look at every file of the format. */
export function smallArchiveInput(changes: Partial<BuildArchiveInput> = {}): BuildArchiveInput {
  const started = appendEvent(emptyChain, { at: '2026-03-01T22:00:00.000Z', kind: 'started', data: { by: 'Wren Alder' } }, sha256Hex);
  const finished = appendEvent(started, { at: '2026-03-01T22:10:00.000Z', kind: 'finished', data: {} }, sha256Hex);
  return {
    run: {
      runId: '01J0RUN',
      outcome: 'finished',
      operator: 'Wren Alder',
      startedAtUtcMs: startUtcMs,
      endedAtUtcMs: startUtcMs + 600_000,
      notes: '',
      massSetLabel: 'lead, 1.6 kg',
      simulated: null,
    },
    rig: wideRig(),
    protocol: { formatVersion: 1, name: 'Short', steps: [{ kind: 'home' }], evaluation: { method: 'equilibrium', drift: 'aba' } },
    steps: [
      stepRow(1, { kind: 'swing', good: null }),
      stepRow(2, { label: '=SUM(A1), "quoted"' }),
      stepRow(3, { endUtcMs: null, uEndS: null, outcome: null, good: null }),
    ],
    events: [started, finished],
    channels: [
      {
        info: { name: 'deflection', quantity: 'angle', unit: 'rad', role: 'deflection' },
        utcMs: Float64Array.of(startUtcMs + 50, startUtcMs + 150, startUtcMs + 250),
        value: Float64Array.of(1.5e-3, -2e-7, 0),
      },
      {
        info: { name: 'box temperature', quantity: 'temperature', unit: 'Cel', role: 'environment' },
        utcMs: Float64Array.of(startUtcMs),
        value: Float64Array.of(21.5),
      },
    ],
    exclusions: [{ startUtcMs, endUtcMs: startUtcMs + 1000, reason: 'a door, twice' }],
    createdAt: '2026-03-02T08:00:00.000Z',
    software: 'Evenfall 0.1.0',
    ...changes,
  };
}
