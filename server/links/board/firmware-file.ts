import { readFileSync } from 'node:fs';
import { join } from 'node:path';
import { programOf } from './intel-hex';

let program: Uint8Array | null = null;

/** The reference firmware as built for the board. */
export function referenceFirmware(): Uint8Array {
  program ??= programOf(readFileSync(join(__dirname, '../../../firmware-protocol/firmware/evenfall.hex'), 'utf8'));
  return program;
}
