import { spawn } from 'node:child_process';
import { mkdtempSync, readdirSync, rmSync, utimesSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { ProcessMarks, type ProcessMark, type ProcessTable } from '@/server/boot/process-marks';

const folder = mkdtempSync(join(tmpdir(), 'evenfall-marks-'));
afterAll(() => rmSync(folder, { recursive: true, force: true }));

/** A machine whose processes are given by hand. */
function machine(own: ProcessMark | null, others: Readonly<Record<number, string>> = {}): ProcessTable {
  return { own: () => own, startTicksOf: (pid) => (pid === own?.pid ? own.startTicks : (others[pid] ?? null)) };
}
const mark = (pid: number, startTicks: string, bootId = 'boot 1', namespace = 'pid:[1]') => ({ bootId, namespace, pid, startTicks });

const nowUtcMs = Date.now();
const errors: unknown[] = [];
const marksOf = (table?: ProcessTable, at = folder) => new ProcessMarks(at, (error) => void errors.push(error), table);
const blind: ProcessTable = {
  own: () => mark(101, '9000'),
  startTicksOf() {
    throw Object.assign(new Error('too many open files'), { code: 'EMFILE' });
  },
};
marksOf(machine(mark(100, '5000'))).leave('killed', nowUtcMs);

test.each<[string, ProcessTable, boolean]>([
  ['its number is not given any more', machine(mark(101, '9000')), true],
  ['its number has been given to another', machine(mark(101, '9000'), { 100: '8000' }), true],
  ['its number is the next one’s own', machine(mark(100, '9000')), true],
  ['it lives', machine(mark(101, '9000'), { 100: '5000' }), false],
  ['the machine was started anew, or is another', machine(mark(101, '9000', 'boot 2')), false],
  ['it ran in another container', machine(mark(101, '9000', 'boot 1', 'pid:[2]')), false],
  ['nothing can be told of processes', machine(null), false],
  ['the look at it fails', blind, false],
])('where %s: gone is %s', (_, table, gone) => {
  expect(marksOf(table).isGone('killed')).toBe(gone);
});

test('a name that nobody left is not known to be gone', () => {
  expect(marksOf(machine(mark(101, '9000'))).isGone('never seen')).toBe(false);
});

test('a mark is swept out when it is a day old and nobody’s, and taken away by hand', () => {
  const marks = marksOf(machine(mark(101, '9000'), { 100: '5000' }));
  utimesSync(join(folder, 'killed.json'), (nowUtcMs - 90_000_000) / 1000, (nowUtcMs - 90_000_000) / 1000);
  marks.leave('second', nowUtcMs);
  expect(readdirSync(folder).sort()).toEqual(['killed.json', 'second.json']);
  marksOf(machine(mark(102, '9500'))).leave('third', nowUtcMs);
  expect(readdirSync(folder).sort()).toEqual(['second.json', 'third.json']);
  marks.forget('second');
  expect(readdirSync(folder)).toEqual(['third.json']);
});

test('this machine: the own process lives, a killed one is gone, also before it is buried', async () => {
  const marks = marksOf();
  marks.leave('here', nowUtcMs);
  expect(marks.isGone('here')).toBe(false);
  const child = spawn(process.execPath, ['-e', 'setInterval(() => undefined, 1000)'], { stdio: 'ignore' });
  const exited = new Promise((resolve) => void child.once('exit', resolve));
  const real = marksOf();
  const table = (real as unknown as { table: ProcessTable }).table;
  const own = table.own() as ProcessMark;
  const startTicks = table.startTicksOf(child.pid as number) as string;
  expect(Number(startTicks)).toBeGreaterThanOrEqual(Number(own.startTicks));
  marksOf(machine({ ...own, pid: child.pid as number, startTicks })).leave('child', nowUtcMs);
  expect(real.isGone('child')).toBe(false);
  child.kill('SIGKILL');
  await exited;
  expect(real.isGone('child')).toBe(true);
});

test('a folder that cannot be written costs the marks, not the start', () => {
  const file = join(folder, 'third.json');
  errors.length = 0;
  const marks = marksOf(machine(mark(101, '9000')), join(file, 'inside'));
  marks.leave('here', nowUtcMs);
  expect(errors).toEqual([expect.objectContaining({ code: 'ENOTDIR' })]);
  expect(marks.isGone('here')).toBe(false);
});
