import { spawnSync } from 'node:child_process';
import { mkdtempSync, readFileSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { buildArchive } from '@/shared/archive/build-archive';
import { evaluationResultSchema, type EvaluationResult } from '@/shared/evaluation/result';
import { main } from '@/server/boot/evaluate';
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

function run(...args: string[]): { code: number; out: string; err: string } {
  const said = { out: '', err: '' };
  const code = main(args, { out: (text) => void (said.out += text), err: (text) => void (said.err += text) });
  return { code, ...said };
}

describe('evaluate', () => {
  const { folder, zip } = archiveOnDisk();

  test('prints one JSON object of the published form and nothing else, the same for folder and ZIP', () => {
    const [fromFolder, fromZip] = [run(folder), run(zip)];
    expect(fromFolder).toMatchObject({ code: 0, err: '' });
    expect(fromZip.out).toBe(fromFolder.out);
    const result = JSON.parse(fromFolder.out) as EvaluationResult;
    expect(evaluationResultSchema.parse(result)).toEqual(result);
    expect(result.G?.value).toBeCloseTo(6.6743e-11, 17);
    expect(result.chain).toEqual({ events: 1, valid: true });
  });

  test('works as a process of its own', () => {
    const child = spawnSync(process.execPath, ['--import', 'tsx', 'server/boot/evaluate.ts', zip], {
      encoding: 'utf8',
      maxBuffer: 1 << 26,
    });
    expect(child.status).toBe(0);
    expect(child.stderr).toBe('');
    expect(JSON.parse(child.stdout)).toEqual(JSON.parse(run(zip).out));
  }, 60_000);

  test('says which file was changed and ends with 2', () => {
    const { folder: tampered } = archiveOnDisk();
    const path = join(tampered, 'steps.csv');
    writeFileSync(path, readFileSync(path, 'utf8').replace('done', 'late'));
    expect(run(tampered)).toEqual({
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
    ['a method that is not built', [folder, '--method', 'period'], '[not-yet]'],
    ['a bound, which is not built', [folder, '--bound', '1e-6'], '[not-yet]'],
    ['a bound that is none', [folder, '--bound', 'wide'], '--bound wide: a positive angle'],
    ['trials that are none', [folder, '--trials', '-5'], '--trials'],
    ['a channel that is not there', [folder, '--channel', 'laser'], 'there is no channel "laser"'],
    ['a file that is no archive', ['package.json'], 'not a readable ZIP'],
  ])('refuses %s with 2 and a sentence', (_what, args, message) => {
    const { code, out, err } = run(...args);
    expect({ code, out }).toEqual({ code: 2, out: '' });
    expect(err).toContain(message);
  });

  test('takes a number of trials and a channel', () => {
    expect(run(folder, '--trials', '0', '--channel', 'deflection', '--method', 'equilibrium').code).toBe(0);
  });
});
