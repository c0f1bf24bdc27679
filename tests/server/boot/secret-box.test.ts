import { mkdtempSync, readFileSync, rmSync, statSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { createSecretBox } from '@/server/boot/secret-box';

let stateDir: string;
beforeEach(() => {
  stateDir = mkdtempSync(join(tmpdir(), 'evenfall-box-'));
});
afterEach(() => rmSync(stateDir, { recursive: true, force: true }));

test('what was sealed is opened by the next process of the same state folder, and by nobody else', () => {
  const sealed = createSecretBox({ secretKey: null, stateDir }).seal('shut-the-bøx', 'rig 1');
  expect(sealed).not.toContain('shut');
  expect(createSecretBox({ secretKey: null, stateDir }).open(sealed, 'rig 1')).toBe('shut-the-bøx');
  expect(createSecretBox({ secretKey: null, stateDir }).open(sealed, 'rig 2')).toBeNull();
  expect(createSecretBox({ secretKey: 'another key of more than thirty letters', stateDir }).open(sealed, 'rig 1')).toBeNull();
  expect(statSync(join(stateDir, 'secret-key')).mode & 0o077).toBe(0);
  expect(sealed).not.toContain(readFileSync(join(stateDir, 'secret-key'), 'utf8'));
});

test('the same text is sealed differently each time, and a changed one is not opened', () => {
  const box = createSecretBox({ secretKey: 'a key that all processes of the lab are given', stateDir });
  const [first, second] = [box.seal('x', 'a'), box.seal('x', 'a')];
  expect(first).not.toBe(second);
  const end = first.at(-1) === 'A' ? 'B' : 'A';
  for (const wrong of [`${first.slice(0, -1)}${end}`, 'sealed:1:', 'sealed:1:AAAA', 'x', '']) expect(box.open(wrong, 'a')).toBeNull();
});
