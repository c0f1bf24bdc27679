import { execFileSync } from 'node:child_process';
import { join } from 'node:path';
import { relay } from './relay';

/**
 * The inner half of a network of its own (`own-network.ts`): arguments are the folder of its sockets, the port that is led in, and those that are led out.
 * Says `ready` and leads on until it is ended.
 */
const [folder = '', inward = '', ...outward] = process.argv.slice(2);
const host = '127.0.0.1';

async function run(): Promise<void> {
  execFileSync('ip', ['link', 'set', 'lo', 'up']);
  await relay({ path: join(folder, 'inward') }, { host, port: Number(inward) });
  for (const port of outward) await relay({ host, port: Number(port) }, { path: join(folder, port) });
  process.stdout.write('ready\n');
}

void run();
