import { spawnSync } from 'node:child_process';
import { mkdtempSync, readFileSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { buildArchive } from '@/shared/archive/build-archive';
import { evaluationResultSchema, type EvaluationResult } from '@/shared/evaluation/result';
import { monteCarlo, type TrialModel } from '@/shared/evaluation/monte-carlo';
import { main } from '@/server/boot/evaluate';
import { createTrialCrew } from '@/server/boot/parallel-trials';
import { writeArchiveFolder, zipArchive } from '@/server/evaluation/archive-files';
import { sha256Hex } from '@/server/evaluation/sha256';
import { alternatingAngles, night } from '../../support/night';
import { wideSourceAngleRad } from '../../support/reference-rigs';

const near = (wideSourceAngleRad * 180) / Math.PI;
const files = buildArchive(night({ anglesDeg: alternatingAngles(6, near, -near), dwellS: 840 }), sha256Hex);

function archiveOnDisk(): { folder: string; zip: string } {
  const place = mkdtempSync(join(tmpdir(), 'evenfall-evaluate-'));
  const [folder, zip] = [join(place, 'run'), join(place, 'run.zip')];
  writeArchiveFolder(files, folder);
  writeFileSync(zip, zipArchive(files));
  return { folder, zip };
}

async function run(...args: string[]): Promise<{ code: number; out: string; err: string }> {
  const said = { out: '', err: '' };
  const code = await main(args, { out: (text) => void (said.out += text), err: (text) => void (said.err += text) });
  return { code, ...said };
}

describe('evaluate', () => {
  const { folder, zip } = archiveOnDisk();

  test('prints one JSON object of the published form and nothing else, the same for folder and ZIP', async () => {
    const [fromFolder, fromZip] = [await run(folder), await run(zip)];
    expect(fromFolder).toMatchObject({ code: 0, err: '' });
    expect(fromZip.out).toBe(fromFolder.out);
    const result = JSON.parse(fromFolder.out) as EvaluationResult;
    expect(evaluationResultSchema.parse(result)).toEqual(result);
    expect(result.G?.value).toBeCloseTo(6.6743e-11, 17);
    expect(result.chain).toEqual({ events: 1, valid: true });
  });

  test('works as a process of its own', async () => {
    const child = spawnSync(process.execPath, ['--import', 'tsx', 'server/boot/evaluate.ts', zip], {
      encoding: 'utf8',
      maxBuffer: 1 << 26,
    });
    expect(child.status).toBe(0);
    expect(child.stderr).toBe('');
    expect(JSON.parse(child.stdout)).toEqual(JSON.parse((await run(zip)).out));
  }, 60_000);

  test('says which file was changed and ends with 2', async () => {
    const { folder: tampered } = archiveOnDisk();
    const path = join(tampered, 'steps.csv');
    writeFileSync(path, readFileSync(path, 'utf8').replace('done', 'late'));
    expect(await run(tampered)).toEqual({
      code: 2,
      out: '',
      err: 'evaluate: steps.csv: the SHA-256 of the file is not the one in datapackage.json: it was changed\n',
    });
  });

  test.each([
    ['a path that is not there', ['/nowhere'], 'there is no file or folder /nowhere'],
    ['no path', [], 'name one archive'],
    ['two paths', ['a', 'b'], 'name one archive'],
    ['an unknown option', [folder, '--colour'], "Unknown option '--colour'"],
    ['an unknown method', [folder, '--method', 'guess'], '--method guess: there are equilibrium'],
    ['modulation where nothing turned', [folder, '--method', 'modulation'], 'steps.csv: the method "modulation" needs a rotation'],
    ['a bound that is none', [folder, '--bound', 'wide'], '--bound wide: a positive angle'],
    ['a bound without end', [folder, '--bound', 'Infinity'], '--bound Infinity: a positive angle'],
    ['a clock that is none', [folder, '--clock', 'early'], '--clock early: "left", or by how many seconds'],
    ['a clock a year off', [folder, '--clock', '31557600'], '--clock 31557600: "left"'],
    ['trials that are none', [folder, '--trials', '-5'], '--trials'],
    ['a channel that is not there', [folder, '--channel', 'laser'], 'there is no channel "laser"'],
    ['a file that is no archive', ['package.json'], 'not a readable ZIP'],
  ])('refuses %s with 2 and a sentence', async (_what, args, message) => {
    const { code, out, err } = await run(...args);
    expect({ code, out }).toEqual({ code: 2, out: '' });
    expect(err).toContain(message);
  });

  test('takes a number of trials and a channel', async () => {
    const { code, out } = await run(folder, '--trials', '0', '--channel', 'deflection', '--method', 'equilibrium');
    expect(code).toBe(0);
    expect((JSON.parse(out) as EvaluationResult).monteCarlo).toBeNull();
  });

  test('draws the same trials in one thread and in several', async () => {
    const model: TrialModel = {
      bigG: 6.6743e-11,
      inputs: [{ input: 'sources.mass', value: 1.6, u: 0.01, law: { kind: 'normal' }, group: null, logSlope: -1 / 1.6 }],
      core: null,
    };
    const crew = createTrialCrew(250_000);
    const parallel = await crew.run(model);
    await crew.close();
    expect(parallel).toEqual(monteCarlo(model, 250_000));
    // exp of a normal exponent of 1/160: mean and spread of the log-normal law.
    expect(parallel?.G_mean).toBeCloseTo(6.6743e-11 * Math.exp(0.5 / 160 ** 2), 14);
    expect((parallel?.G_u ?? 0) / 6.6743e-11).toBeCloseTo(1 / 160, 4);
  });
});
