import { execFile } from 'node:child_process';
import { join } from 'node:path';
import { promisify } from 'node:util';
import { DatabaseDoor } from './database-door';

const cluster = join(__dirname, '..', '..', 'cluster.mjs');

/**
 * A PostgreSQL cluster of its own that can be crashed and started again, behind an address that stays the same: each start takes a port of
 * its own choice.
 */
export class CrashingDatabase {
  private constructor(
    private readonly name: string,
    private readonly door: DatabaseDoor,
    readonly url: URL,
  ) {}

  static async start(name: string): Promise<CrashingDatabase> {
    const door = await DatabaseDoor.build();
    const address = await call('url', name);
    door.open(portOf(address));
    return new CrashingDatabase(name, door, new URL(door.through(address)));
  }

  /** As a power cut: nothing is written any more, every connection breaks. */
  async crash(): Promise<void> {
    await call('crash', this.name);
    this.door.cut();
  }

  async recover(): Promise<void> {
    this.door.open(portOf(await call('url', this.name)));
  }

  async end(): Promise<void> {
    this.door.end();
    await call('stop', this.name);
  }
}

const portOf = (address: string) => Number(new URL(address).port);

async function call(act: 'url' | 'crash' | 'stop', name: string): Promise<string> {
  const { stdout } = await promisify(execFile)(process.execPath, [cluster, act, name]);
  return stdout.trim().split('\n').at(-1) ?? '';
}
