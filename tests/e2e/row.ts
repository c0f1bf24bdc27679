import { readdirSync } from 'node:fs';
import { join } from 'node:path';

/**
 * All browser tests as one: each file would load the server and the browser's library anew, which costs more than many of them. A single one runs
 * by its name as always. Those that mostly wait for a line in real time come first, while the tests beside the row have work for the processors.
 */

const suffix = '.test.ts';
const waiting = ['board', 'serial'];
const files = readdirSync(__dirname)
  .filter((name) => name.endsWith(suffix))
  .map((name) => name.slice(0, -suffix.length));

describe.each([...waiting, ...files.filter((name) => !waiting.includes(name))])('%s', (name) => {
  let startMs = 0;
  beforeAll(() => void (startMs = performance.now()));
  require(join(__dirname, `${name}${suffix}`));
  afterAll(() => void process.stdout.write(`     e2e ${name} (${((performance.now() - startMs) / 1000).toFixed(1)} s)\n`));
});

jest.setTimeout(240_000);
