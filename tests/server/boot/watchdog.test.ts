import { spawn } from 'node:child_process';
import { once } from 'node:events';
import { join } from 'node:path';

/** The watchdog in processes of their own, in real time, with a tenth of the usual patience. */
jest.setTimeout(60_000);

const root = join(__dirname, '../../..');

async function live(deed: string): Promise<{ signal: string | null; said: string }> {
  const program = `
    const { startWatchdog } = require('./server/boot/watchdog.ts');
    startWatchdog({ slowMs: 300, longestMs: 750 });
    const until = (ms) => { const end = performance.now() + ms; while (performance.now() < end); };
    setTimeout(() => { ${deed} }, 1500);
    setTimeout(() => process.exit(0), 6000);`;
  const child = spawn(process.execPath, ['--import', 'tsx', '-e', program], { cwd: root, stdio: ['ignore', 'ignore', 'pipe'] });
  let said = '';
  child.stderr.on('data', (chunk: Buffer) => (said += chunk.toString()));
  const [, signal] = (await once(child, 'close')) as [number | null, string | null];
  return { signal, said };
}

test('a loop that is stuck ends the process, one that stumbles once does not', async () => {
  const [stuck, crawling, stumbling] = await Promise.all([
    live('for (;;);'),
    live('setInterval(() => until(450), 460);'),
    live('until(600);'),
  ]);
  expect(stuck).toMatchObject({ signal: 'SIGKILL', said: expect.stringContaining('The event loop lags by') });
  expect(crawling.signal).toBe('SIGKILL');
  expect(stumbling).toEqual({ signal: null, said: '' });
});
