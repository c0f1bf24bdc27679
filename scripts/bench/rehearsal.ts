import { mkdtempSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { readArchive } from '@/shared/archive/read-archive';
import { evaluateArchive } from '@/shared/evaluation/evaluate-archive';
import type { ProtocolDocument } from '@/shared/protocol/document';
import { main as rehearse } from '@/server/boot/rehearse';
import { readArchiveFiles } from '@/server/evaluation/archive-files';
import { sha256Hex } from '@/server/evaluation/sha256';
import { growth, report } from './report';

/** Rehearses nights of 3, 6 and 12 h with 10 Hz deflection, writes their archives, reads them back and evaluates them. */

const periodS = 420;
const beatsPerHour = 3600 / (2 * periodS);
const folder = mkdtempSync(join(tmpdir(), 'evenfall-bench-rehearsal-'));

const night = (hours: number): ProtocolDocument => ({
  formatVersion: 1,
  name: `${hours} h of reversals`,
  evaluation: { method: 'equilibrium', drift: 'aba', channel: 'deflection' },
  steps: [
    { kind: 'home' },
    { kind: 'swing', to: 'near' },
    {
      kind: 'repeat',
      times: Math.round((hours * beatsPerHour) / 2),
      steps: [
        { kind: 'swing', to: 'far' },
        { kind: 'dwell', beat_periods: 2 },
        { kind: 'swing', to: 'near' },
        { kind: 'dwell', beat_periods: 2 },
      ],
    },
  ],
});

async function once(hours: number): Promise<{ elapsedS: number; simulatedS: number }> {
  const [protocol, out] = [join(folder, `${hours}.json`), join(folder, `${hours}`)];
  writeFileSync(protocol, JSON.stringify(night(hours)));
  let answer = '';
  const began = performance.now();
  await rehearse([protocol, '--out', out], { out: (text) => void (answer = text), err: (text) => void process.stderr.write(text) });
  evaluateArchive(readArchive(readArchiveFiles(out), sha256Hex));
  const elapsedS = (performance.now() - began) / 1000;
  return { elapsedS, simulatedS: (JSON.parse(answer) as { simulated_s: number }).simulated_s };
}

async function run(): Promise<void> {
  const points: { size: number; cost: number }[] = [];
  for (const hours of [3, 6, 12]) {
    const { elapsedS, simulatedS } = await once(hours);
    points.push({ size: hours, cost: elapsedS });
    report({ name: `rehearsal ${hours} h`, value: elapsedS, unit: 's', goal: 10, want: 'at most', peer: null });
    if (hours === 12)
      report({ name: 'rehearsal speed', value: simulatedS / elapsedS, unit: '× real time', goal: 4000, want: 'at least', peer: null });
  }
  report({ name: 'rehearsal growth', value: growth(points), unit: 'exponent', goal: 1.2, want: 'at most', peer: null });
  rmSync(folder, { recursive: true });
}

void run();
