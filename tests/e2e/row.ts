import { readdirSync } from 'node:fs';
import { join } from 'node:path';

/**
 * All browser tests as one: each file would load the server and the browser's library anew, which costs more than many of them. A single one runs
 * by its name as always.
 */

const suffix = '.test.ts';
const files = readdirSync(__dirname).filter((name) => name.endsWith(suffix));

describe.each(files.map((name) => name.slice(0, -suffix.length)))('%s', (name) => {
  let startMs = 0;
  beforeAll(() => void (startMs = performance.now()));
  require(join(__dirname, `${name}${suffix}`));
  afterAll(() => void process.stdout.write(`     e2e ${name} (${((performance.now() - startMs) / 1000).toFixed(1)} s)\n`));
});

jest.setTimeout(240_000);
