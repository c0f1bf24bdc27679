import { demoIds } from '@/db/demo/seed';
import type { ChainedEvent } from '@/shared/archive/run-records';
import type { ProtocolDocument } from '@/shared/protocol/document';
import { sizes, type Size } from '../support/browser';
import { chapters, Hand, until } from './support/hand';
import { labOfThisFile } from './support/lab';
import { issued, read, shortNight, started } from './support/night';

/**
 * Story 5: hands in the rig, a line that drops, a server that restarts, a database that goes away and a controller that resets, all in one
 * night, watched from a page that stays open. On the phone the protocol says `hold`, at the desk `resume`; the outcomes are those of docs/faults.md.
 */

jest.setTimeout(120_000);
const lab = labOfThisFile();
const policies = { phone: 'hold', wide: 'resume' } as const satisfies Record<Size, ProtocolDocument['onInterruption']>;

describe.each(Object.keys(sizes) as Size[])('%s', (size) => {
  const policy = policies[size];
  let hand: Hand;
  let runId: string;
  const chapter = chapters(() => hand);
  const events = async () => ((await read(lab(), `${runId}/events?limit=500`)) as { items: ChainedEvent[] }).items;
  const stateNow = async (): Promise<string> => (await read(lab(), runId)).state;
  const controller = () => lab().server.world.controller(demoIds.rig);

  beforeAll(async () => {
    await lab().server.arm(20);
    runId = await started(lab(), await issued(lab(), { ...shortNight(`Night under ${policy}`, 2), onInterruption: policy }));
    hand = new Hand(await lab().open(size, 'operator'));
  }, 60_000);
  afterAll(async () => {
    // What the page asks for while the server or the database is away is answered so, and a browser notes that as an error of its own.
    expect(hand.browser.errors.filter((words) => !/status of 503/.test(words))).toEqual([]);
    await lab().close(hand.browser);
  });

  /** In a dwell, well before its end. */
  async function passIntoDwell(): Promise<void> {
    for (let strides = 0; strides < 60 && (await read(lab(), runId)).current?.kind !== 'dwell'; strides += 1) await lab().pass(20);
    await lab().pass(30);
  }

  async function resumes(): Promise<void> {
    await hand.taps('resume');
    await hand.at('resume-sheet').waitFor();
    await hand.keeps('resume-confirm');
    await hand.at('resume-sheet').waitFor({ state: 'detached' });
    await until(async () => (await stateNow()) === 'running', 'the run to go on');
  }

  /** What an interruption came to: held until a person resumes, or gone on by itself. */
  async function comesTo(why: RegExp, shot: string): Promise<void> {
    if (policy === 'hold') {
      await hand.reads('run-state', 'Held');
      await hand.reads('held-notice', why);
      await hand.shoots(shot);
      await resumes();
      return;
    }
    await until(async () => {
      await lab().pass(5);
      return (await stateNow()) === 'running';
    }, 'the run to go on by itself');
    await hand.reads('run-state', /Dwell|Swing/);
    await hand.shoots(shot);
  }

  chapter('hands in the rig: one tap brings everything to rest, and the lock is lifted at the rig, not from afar', async () => {
    await lab().pass(40);
    await hand.goes(`/rigs/${demoIds.rig}`, 'rig-screen');
    await hand.taps('set-lock');
    await hand.reads('locked-notice', 'Ilse Marrowby has hands in the rig. Nothing moves.');
    await until(async () => (await stateNow()) === 'held', 'the run to be held');
    await hand.taps('lift-lock');
    await hand.reads('lift-sheet', 'Turn the arm key at the rig, on or off, at most 2 minutes before');
    await hand.taps('lift-sure');
    await hand.taps('lift-confirm');
    await hand.reads(
      'lift-sheet',
      /A personal lock is lifted at the rig: turn the arm key of .*, on or off, and lift the lock within 2 min\./,
    );
    await hand.shoots('lift-from-afar');
    for (const key of ['off', 'on']) {
      const said = key === 'on' ? 'Turn the virtual key off' : 'Turn the virtual key on';
      await hand.taps(hand.page.getByTestId('lift-sheet').getByTestId('virtual-key'));
      await hand.page.getByTestId('lift-sheet').getByText(said).waitFor();
    }
    await hand.taps('lift-confirm');
    await hand.at('lift-sheet').waitFor({ state: 'detached' });
    await hand.at('locked-notice').waitFor({ state: 'detached' });
    await hand.asksToArm();
    await hand.turnsVirtualKey();
    await lab().pass(121);
    await hand.reads('armed-by', 'Armed by Ilse Marrowby');
    await hand.follows(`/runs/${runId}`, 'run-screen');
    await hand.reads('held-notice', /personal lock/);
    await resumes();
  });

  chapter('a line that drops is told at once, and the run comes to what its protocol says', async () => {
    await passIntoDwell();
    controller().dropLine(30_000);
    await lab().pass(8);
    await hand.reads('lost-notice', 'The server hears nothing from the controller.');
    await hand.shoots('line-lost');
    await lab().pass(35);
    await hand.at('lost-notice').waitFor({ state: 'detached' });
    await comesTo(/link to the controller was lost/, 'line-back');
  });

  chapter('a server that restarts takes the run up again, and the page finds it by itself', async () => {
    await passIntoDwell();
    await lab().restarts(5);
    await hand.reads('link-chip', /^live/);
    await comesTo(/server/, 'server-back');
    expect((await events()).some(({ kind }) => kind === 'server-restarted')).toBe(true);
  });

  chapter('while the database is away the masses rest, and the page goes on telling what the rig does', async () => {
    await passIntoDwell();
    await lab().passWithoutDatabase(10, async () => {
      await hand.reads('run-state', /Held|Waiting|Dwell/);
      await hand.sees(/The database is away since/);
      await hand.shoots('database-away');
    });
    await comesTo(/database/, 'database-back');
  });

  chapter('a controller that reset is never resumed: it has lost its position, and only a new run homes', async () => {
    await passIntoDwell();
    controller().reset();
    await lab().pass(10);
    await hand.reads('run-state', 'Held');
    await hand.reads('held-notice', /controller restarted/);
    // What is drawn of the turntable is said to be old.
    await hand.page.getByText('position not known').filter({ visible: true }).first().waitFor();
    await hand.shoots('controller-reset');
    expect(await hand.isEnabled('resume')).toBe(false);
    await hand.reads('resume-why', 'this run cannot go on. Stop it, and home the rig in a new run.');
    await hand.taps('stop');
    await hand.at('result-screen').waitFor();
    await hand.reads('headline', /Stopped at/);
    await hand.shoots('ended');
  });

  chapter('the log is whole, and every interruption is in it, each once', async () => {
    const log = await events();
    expect(log.map(({ seq }) => seq)).toEqual(log.map((_, index) => index + 1));
    const kinds = log.map(({ kind }) => kind);
    for (const kind of ['link-lost', 'server-restarted', 'database-away', 'database-back', 'controller-reset'])
      expect([kind, kinds.filter((each) => each === kind).length]).toEqual([kind, 1]);
    expect(kinds).not.toContain('interlock');
    await hand.goes(`/runs/${runId}/log`, 'step-log');
    await hand.reads('chain-head', `${String(log.length)} events`);
  });
});
