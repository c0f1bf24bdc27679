import type { ChainedEvent } from '@/shared/archive/run-records';
import type { ProtocolDocument } from '@/shared/protocol/document';
import { sizes, type Size } from '../support/browser';
import { chapters, Hand, until } from './support/hand';
import { labOfThisFile } from './support/lab';
import { issued, read, started } from './support/night';

/** A night that says by half an hour after its start whether it is worth running: a first proof is sound and the run goes on, a second one is not and holds it. */

jest.setTimeout(90_000);
const lab = labOfThisFile();
const HALF_HOUR_MS = 1_800_000;
const dwell = { kind: 'dwell', beat_periods: 2 } as const;
const near = { kind: 'swing', to: 'near' } as const;
const far = { kind: 'swing', to: 'far' } as const;
const night: ProtocolDocument = {
  formatVersion: 1,
  name: 'Night with proofs',
  evaluation: { method: 'equilibrium', drift: 'aba', channel: 'deflection' },
  steps: [
    { kind: 'home' },
    ...[near, dwell, far, dwell],
    { kind: 'proof', label: 'as a night begins' },
    ...[near, dwell, far, dwell],
    // No pair lies so close to its plan.
    { kind: 'proof', size: 0.00001, label: 'with a limit that no pair keeps' },
    near,
  ],
};

describe.each(Object.keys(sizes) as Size[])('%s', (size) => {
  let hand: Hand;
  let runId: string;
  const chapter = chapters(() => hand);
  const proofs = async () =>
    ((await read(lab(), `${runId}/events?limit=200`)) as { items: ChainedEvent[] }).items.filter(({ kind }) => kind === 'proof');
  const stateNow = async (): Promise<string> => (await read(lab(), runId)).state;

  /** In strides, until so many proofs are in the log. */
  async function passToProof(count: number): Promise<void> {
    for (let strides = 0; strides < 60 && (await proofs()).length < count; strides += 1) await lab().pass(30);
    expect(await proofs()).toHaveLength(count);
  }

  beforeAll(async () => {
    await lab().server.arm(20);
    runId = await started(lab(), await issued(lab(), night));
    hand = new Hand(await lab().open(size, 'operator'));
  }, 60_000);
  afterAll(async () => {
    expect(hand.browser.errors).toEqual([]);
    await lab().close(hand.browser);
  });

  chapter('half an hour after the start the log says that the night is sound, and the run goes on', async () => {
    await passToProof(1);
    const { startedAt } = (await read(lab(), runId)) as { startedAt: string };
    const [first] = await proofs();
    expect(first?.data).toMatchObject({
      sound: true,
      tests: expect.arrayContaining([expect.objectContaining({ test: 'period', ok: true })]),
    });
    expect(Date.parse(first?.at ?? '') - Date.parse(startedAt)).toBeLessThan(HALF_HOUR_MS);
    await hand.goes(`/runs/${runId}`, 'run-screen');
    await hand.reads('run-state', /Swing|Dwell/);
    await hand.sees(/Proof/);
    await hand.shoots('sound');
  });

  chapter('a proof that is not sound holds the run, with its figures, and is an alarm', async () => {
    await passToProof(2);
    await until(async () => (await stateNow()) === 'held', 'the run to be held');
    await hand.reads('run-state', 'Held');
    const notice = await hand.reads('held-notice', /The proof of step .* says that the night is not sound: /);
    expect(notice).toMatch(/near minus far [\d.]+ mrad, planned [\d.]+ mrad: [\d.]+ % off, 0\.001.* % allowed/);
    expect(notice).toContain('Resuming goes on with the next step.');
    await hand.shoots('held');
    await hand.goes('/alarms', 'alarms-screen');
    await hand.sees('First pair is not as predicted');
    await hand.shoots('alarm');
  });

  chapter('whoever looked at the figures resumes: the run goes on to its end, and the log has both proofs', async () => {
    await hand.goes(`/runs/${runId}`, 'run-screen');
    await hand.taps('resume');
    await hand.at('resume-sheet').waitFor();
    await hand.keeps('resume-confirm');
    await hand.at('resume-sheet').waitFor({ state: 'detached' });
    await until(async () => {
      await lab().pass(10);
      return (await stateNow()) === 'finished';
    }, 'the run to finish');
    expect((await proofs()).map(({ data }) => data['sound'])).toEqual([true, false]);
    await hand.goes(`/runs/${runId}/log`, 'step-log');
    await hand.sees(/with a limit that no pair keeps/);
    await hand.taps('events-6');
    await hand.sees(/sound yes .*tests near lies on its side of far; near minus far/);
    await hand.at('events-6').scrollIntoViewIfNeeded();
    await hand.shoots('log');
  });
});
