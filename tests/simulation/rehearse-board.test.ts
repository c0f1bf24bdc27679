import { mkdtempSync, readFileSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { main } from '@/server/boot/rehearse';
import { readArchiveFiles } from '@/server/evaluation/archive-files';
import { sha256Hex } from '@/server/evaluation/sha256';
import { readArchive } from '@/shared/archive/read-archive';
import { evaluateArchive } from '@/shared/evaluation/evaluate-archive';
import { CODATA_2022_G } from '@/shared/physics/constants';
import type { ProtocolDocument } from '@/shared/protocol/document';
import { demoRigWide } from '@/shared/rig/demo-rigs';

/** `rehearse --board`: the night is driven by the controller's own firmware, instruction by instruction, in simulated time. */

const folder = mkdtempSync(join(tmpdir(), 'evenfall-board-'));
afterAll(() => rmSync(folder, { recursive: true }));

/** A quick pendulum without noise, so that seven minutes tell G. */
const rig = {
  ...demoRigWide,
  noise: undefined,
  measured: { period_s: { value: 60, u: 0.01, unit: 's' }, decayTime_s: { value: 150, u: 3, unit: 's' } },
};
const [near, far] = (['near', 'far'] as const).map((to) => [
  { kind: 'swing' as const, to },
  { kind: 'dwell' as const, for_s: 120 },
]) as [ProtocolDocument['steps'], ProtocolDocument['steps']];
const protocol: ProtocolDocument = { formatVersion: 1, name: 'On the board', steps: [{ kind: 'home' }, ...near, ...far, ...near] };

test('gives the G that the pendulum was made with, from an archive that verifies', async () => {
  const write = (name: string, document: object) => {
    writeFileSync(join(folder, name), JSON.stringify(document));
    return join(folder, name);
  };
  const out = join(folder, 'night');
  let told = '';
  const code = await main([write('protocol.json', protocol), '--rig', write('rig.json', rig), '--board', '--out', out], {
    out: (text) => void (told += text),
    err: (text) => void (told += text),
  });
  expect({ code, told }).toEqual({ code: 0, told: expect.stringContaining('"outcome":"finished"') });
  const archive = readArchive(readArchiveFiles(out), sha256Hex);
  const { chain, G, dwells } = evaluateArchive(archive).result;
  expect(chain?.valid).toBe(true);
  expect(dwells).toHaveLength(3);
  expect((G?.value ?? NaN) / CODATA_2022_G.value).toBeCloseTo(1, 7);
  // The controller's own proofs of its position are in the log: the edge passed at 0 in each swing.
  const events = readFileSync(join(out, 'events.jsonl'), 'utf8').trim().split('\n');
  const passes = events
    .map((line) => JSON.parse(line) as { kind: string; data: { offDeg?: number } })
    .filter(({ kind }) => kind === 'home-edge');
  expect(passes.length).toBeGreaterThanOrEqual(4);
  expect(passes.every(({ data }) => Math.abs(data.offDeg ?? NaN) < 1.01 / rig.motion!.stepsPerDegree)).toBe(true);
}, 120_000);

test('a rig that asks for more than the firmware can do is refused in a sentence', async () => {
  writeFileSync(join(folder, 'fine.json'), JSON.stringify({ ...rig, motion: { ...rig.motion, stepsPerDegree: 2000 } }));
  writeFileSync(join(folder, 'fine-protocol.json'), JSON.stringify(protocol));
  let told = '';
  const code = await main(
    [join(folder, 'fine-protocol.json'), '--rig', join(folder, 'fine.json'), '--board', '--out', join(folder, 'fine')],
    {
      out: (text) => void (told += text),
      err: (text) => void (told += text),
    },
  );
  expect({ code, told }).toEqual({
    code: 2,
    told: expect.stringMatching(/^rehearse: The rig cannot be driven by the controller board: .+ deg\/s.*\n$/),
  });
}, 30_000);
