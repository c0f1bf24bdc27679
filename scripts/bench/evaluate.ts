import { execFileSync, spawnSync } from 'node:child_process';
import { mkdtempSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { buildArchive } from '@/shared/archive/build-archive';
import type { StepRow } from '@/shared/archive/run-records';
import { CODATA_2022_G } from '@/shared/physics/constants';
import { createSimulatedBalance } from '@/shared/physics/simulated-balance';
import { trapezoid } from '@/shared/physics/trapezoid';
import { demoRigWide } from '@/shared/rig/demo-rigs';
import { boxAverage } from '@/shared/statistics/box-average';
import { ringDownSegment } from '@/shared/statistics/ring-down';
import { ringDownStart } from '@/shared/statistics/ring-down-start';
import { fitSeparable } from '@/shared/statistics/variable-projection';
import { writeArchiveFolder } from '@/server/evaluation/archive-files';
import { sha256Hex } from '@/server/evaluation/sha256';
import { growth, report } from './report';

/** Evaluates nights of 3, 6 and 12 h at 10 Hz; the peer of the fit is SciPy's curve_fit on each dwell by itself. */

const rateHz = 10;
const cycleS = 900;
const startUtcMs = Date.UTC(2026, 0, 1);

interface Night {
  samples: number;
  folder: string;
  /** Seconds from the start and readings of each dwell. */
  dwells: { t: Float64Array; y: Float64Array }[];
}

function row(seq: number, kind: 'swing' | 'dwell', span: { fromS: number; toS: number; fromDeg: number; toDeg: number }): StepRow {
  const [from, to] = [startUtcMs + span.fromS * 1000, startUtcMs + span.toS * 1000];
  return {
    seq,
    path: `1.repeat[${seq}].${kind}`,
    kind,
    label: '',
    station: span.toDeg > 0 ? 'near' : 'far',
    plannedStartUtcMs: from,
    plannedEndUtcMs: to,
    startUtcMs: from,
    endUtcMs: to,
    uStartS: 1e-4,
    uEndS: 1e-4,
    angleStartDeg: span.fromDeg,
    angleEndDeg: span.toDeg,
    outcome: 'done',
    angleSource: 'counted',
    uAngleDeg: 0.01,
    good: kind === 'dwell' ? true : null,
  };
}

function night(cycles: number): Night {
  const near = 20.18;
  const angles = Array.from({ length: cycles + 1 }, (_, k) => (k % 2 === 0 ? -near : near));
  const moves = angles.slice(1).map((toDeg, k) => trapezoid({ fromDeg: angles[k] as number, toDeg, speedDegS: 6, accelerationDegS2: 2 }));
  const angleDegAt = (utcMs: number) => {
    const s = (utcMs - startUtcMs) / 1000;
    const k = Math.min(moves.length - 1, Math.max(0, Math.floor(s / cycleS)));
    return (moves[k] as (typeof moves)[number]).angleDegAt(s - k * cycleS);
  };
  const balance = createSimulatedBalance({ rig: demoRigWide, bigG: CODATA_2022_G.value, seed: 1, rateHz, startUtcMs, startDeg: -near });
  const { utcMs, value } = balance.advance({ toUtcMs: startUtcMs + cycles * cycleS * 1000, angleDegAt });
  const steps = moves.flatMap((move, k) => {
    const span = { fromDeg: angles[k] as number, toDeg: angles[k + 1] as number };
    const [begin, still, end] = [k * cycleS, k * cycleS + move.durationS, (k + 1) * cycleS];
    return [
      row(2 * k + 1, 'swing', { ...span, fromS: begin, toS: still }),
      row(2 * k + 2, 'dwell', { ...span, fromDeg: span.toDeg, fromS: still, toS: end }),
    ];
  });
  const input = {
    run: {
      runId: 'bench',
      outcome: 'finished' as const,
      operator: 'bench',
      startedAtUtcMs: startUtcMs,
      endedAtUtcMs: null,
      notes: '',
      massSetLabel: '',
      simulated: null,
    },
    rig: demoRigWide,
    protocol: { formatVersion: 1 as const, name: 'Bench', steps: [{ kind: 'home' as const }] },
    steps,
    events: [],
    channels: [{ info: { name: 'deflection', quantity: 'angle', unit: 'rad', role: 'deflection' as const }, utcMs, value }],
    createdAt: '2026-01-02T00:00:00.000Z',
    software: 'bench',
  };
  const folder = join(mkdtempSync(join(tmpdir(), 'evenfall-bench-')), 'archive');
  writeArchiveFolder(buildArchive(input, sha256Hex), folder);
  const dwells = steps
    .filter(({ kind }) => kind === 'dwell')
    .map((dwell) => {
      const from = utcMs.findIndex((ms) => ms >= dwell.startUtcMs + 3000);
      const to = Math.min(utcMs.length, from + (cycleS - 16) * rateHz);
      return { t: utcMs.slice(from, to).map((ms) => (ms - dwell.startUtcMs) / 1000), y: value.slice(from, to) };
    });
  return { samples: utcMs.length, folder, dwells };
}

const seconds = (work: () => void) => {
  const start = performance.now();
  work();
  return (performance.now() - start) / 1000;
};

const best = (times: number, work: () => void) => Math.min(...Array.from({ length: times }, () => seconds(work)));

/** From the samples of all dwells to ω, γ and every centre, the start sought without a hint. */
function fitAll(dwells: Night['dwells']): void {
  const data = dwells.map(({ t, y }) => boxAverage(t, y, 7)).map(({ t, y, weight }) => ({ tS: t, y, weight }));
  const start = ringDownStart(data, null);
  if (start === null) throw new Error('the benchmark found no start');
  const fit = fitSeparable(data.map(ringDownSegment), [start.omega, start.gamma]);
  if (!fit.converged || Math.abs((2 * Math.PI) / (fit.alpha[0] as number) - 420) > 1) throw new Error('the benchmark did not fit');
}

const curveFit = `
import sys, time
import numpy as np
from scipy.optimize import curve_fit
def model(t, c0, c1, a, b, w, g):
    return c0 + c1 * (t - 450) + np.exp(-g * t) * (a * np.cos(w * t) + b * np.sin(w * t))
data = [np.fromfile(path).reshape(2, -1) for path in sys.argv[1:]]
start = time.perf_counter()
for t, y in data:
    curve_fit(model, t, y, p0=[y.mean(), 0, 1e-3, 1e-3, 0.0157, 0.0012])
print(time.perf_counter() - start)
`;

/** Seconds that SciPy takes for one fit for each dwell at full rate; null where there is no SciPy. */
function sciPy(dwells: Night['dwells'], folder: string): number | null {
  const paths = dwells.map(({ t, y }, k) => {
    const path = join(folder, `dwell-${k}.bin`);
    writeFileSync(
      path,
      Buffer.concat([Buffer.from(t.buffer, t.byteOffset, t.byteLength), Buffer.from(y.buffer, y.byteOffset, y.byteLength)]),
    );
    return path;
  });
  const python = ['/usr/bin/python3', 'python3'].find(
    (program) => spawnSync(program, ['-c', 'import scipy'], { stdio: 'ignore' }).status === 0,
  );
  if (python === undefined) return null;
  return Number(execFileSync(python, ['-c', curveFit, ...paths], { encoding: 'utf8' }));
}

const points = [12, 24, 48].map((cycles) => {
  const one = night(cycles);
  const cost = best(3, () => {
    const { status, stderr } = spawnSync(process.execPath, ['--import', 'tsx', 'server/boot/evaluate.ts', one.folder], {
      encoding: 'utf8',
      maxBuffer: 1 << 26,
    });
    if (status !== 0) throw new Error(stderr);
  });
  report({ name: `evaluate ${one.samples}`, value: cost, unit: 's', goal: 3, want: 'at most', peer: null });
  if (cycles === 48) {
    const value = best(5, () => fitAll(one.dwells));
    const peer = sciPy(one.dwells, join(one.folder, '..'));
    report({ name: 'evaluate fit', value, unit: 's', goal: 0.2, want: 'at most', peer });
    if (peer !== null)
      report({ name: 'evaluate fit against SciPy', value: peer / value, unit: '× faster', goal: 5, want: 'at least', peer: null });
  }
  rmSync(join(one.folder, '..'), { recursive: true });
  return { size: one.samples, cost };
});
report({ name: 'evaluate growth', value: growth(points), unit: 'exponent', goal: 1.1, want: 'at most', peer: null });
