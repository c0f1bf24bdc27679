import { execFileSync } from 'node:child_process';
import { readFileSync } from 'node:fs';
import { join } from 'node:path';

const root = join(__dirname, '..', '..', '..');

test('the committed image is what the sources give, byte for byte', () => {
  // Ends with an error that says what to do when they differ.
  execFileSync(process.execPath, [join(root, 'scripts', 'firmware.mjs'), '--check'], { stdio: 'pipe', timeout: 120_000 });
}, 120_000);

test('the image is a well-formed Intel HEX file within the 32 KB of the board', () => {
  const lines = readFileSync(join(root, 'firmware-protocol', 'firmware', 'evenfall.hex'), 'latin1')
    .trimEnd()
    .split(/\r?\n/);
  expect(lines.at(-1)).toBe(':00000001FF');
  for (const line of lines) {
    expect(line).toMatch(/^:([0-9A-F]{2})+$/);
    const bytes = Buffer.from(line.slice(1), 'hex');
    expect(bytes.length).toBe((bytes[0] as number) + 5);
    expect(bytes.reduce((sum, byte) => sum + byte, 0) & 0xff).toBe(0);
    expect(bytes.readUInt16BE(1) + (bytes[0] as number)).toBeLessThanOrEqual(32_768);
  }
});
