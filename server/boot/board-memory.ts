import { mkdirSync, readFileSync, renameSync, writeFileSync } from 'node:fs';
import { dirname } from 'node:path';
import { deserialize, serialize } from 'node:v8';
import type { BoardState } from '../links/board/emulated-board';
import { sha256Hex } from '../evaluation/sha256';

export interface SavedBoard {
  /** Of the state. */
  atUtcMs: number;
  state: BoardState;
}

const FORMAT = 1;

/** An emulated board on disk: a real one stays as it is when the server restarts, and so does this one. */
export class BoardMemory {
  constructor(private readonly file: string) {
    mkdirSync(dirname(file), { recursive: true });
  }

  /** What was saved; null where nothing usable is. `program`: a state belongs to the program it was made by. */
  load(program: Uint8Array): { saved: SavedBoard; sameProgram: boolean } | null {
    try {
      const { format, firmware, ...saved } = deserialize(readFileSync(this.file)) as SavedBoard & { format: number; firmware: string };
      return format === FORMAT ? { saved, sameProgram: firmware === nameOf(program) } : null;
    } catch {
      return null;
    }
  }

  save(saved: SavedBoard, program: Uint8Array): void {
    writeFileSync(`${this.file}.new`, serialize({ format: FORMAT, firmware: nameOf(program), ...saved }));
    renameSync(`${this.file}.new`, this.file);
  }
}

const nameOf = (program: Uint8Array) => sha256Hex(Buffer.from(program).toString('latin1'));
