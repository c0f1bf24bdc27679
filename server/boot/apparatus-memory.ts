import { mkdirSync, readFileSync } from 'node:fs';
import { rename, writeFile } from 'node:fs/promises';
import { join } from 'node:path';
import * as z from 'zod';

const stateSchema = z.strictObject({
  /** Names the boot of the simulated controller. */
  seed: z.number().int(),
  /** How long it had been on at `atUtcMs`, s. */
  uptimeS: z.number(),
  atUtcMs: z.number(),
  angleDeg: z.number(),
  positionKnown: z.boolean(),
});
export type ApparatusState = z.infer<typeof stateSchema>;

/**
 * Where the simulated turntable stands, on disk: a real one stays as it is when the server restarts, and so does this one.
 * Without the file it is a turntable that has just been switched on.
 */
export class ApparatusMemory {
  private writing: Promise<void> = Promise.resolve();

  constructor(private readonly folder: string) {
    mkdirSync(folder, { recursive: true });
  }

  load(rigId: string): ApparatusState | null {
    try {
      return stateSchema.parse(JSON.parse(readFileSync(this.file(rigId), 'utf8')));
    } catch {
      return null;
    }
  }

  save(rigId: string, state: ApparatusState): void {
    this.writing = this.writing.then(() => this.write(rigId, state)).catch(() => undefined);
  }

  async idle(): Promise<void> {
    await this.writing;
  }

  private async write(rigId: string, state: ApparatusState): Promise<void> {
    const file = this.file(rigId);
    await writeFile(`${file}.new`, JSON.stringify(state));
    await rename(`${file}.new`, file);
  }

  private file(rigId: string): string {
    return join(this.folder, `${rigId.replaceAll(/[^\w-]/g, '')}.json`);
  }
}
