import type { ProtocolDocument, Step } from '@/shared/protocol/document';
import { type Bench, brief, makeBench, runStart, startUtcMs } from './rig-bench';
import { readerOf, type Signal } from './signals';

/** Steps that end by what is measured or by a person, and what a dwell that is not good does to a repeat. */

const withSteps = (...steps: Step[]): ProtocolDocument => ({
  formatVersion: 1,
  name: 'Conditions',
  steps: [{ kind: 'home' }, { kind: 'swing', to: 'near' }, ...steps, { kind: 'mark', label: 'after' }],
});

async function running(protocol: ProtocolDocument, ...signals: Signal[]): Promise<Bench> {
  const bench: Bench = makeBench(
    runStart(protocol),
    readerOf(() => bench, signals),
  );
  bench.driver.start();
  await bench.pass(20);
  return bench;
}

const eventOf = (bench: Bench, kind: string) => bench.store.events.findLast((event) => event.kind === kind)?.data;
const state = (bench: Bench) => bench.driver.facts().state;

describe('a wait for a channel', () => {
  const wait: Step = { kind: 'wait', until: { channel: 'box temperature', below: 22, for_s: 60 }, atMost_s: 600 };
  const cooling = (belowFromS: number): Signal => ({ name: 'box temperature', unit: 'degC', at: (t) => (t < belowFromS ? 23 : 21.5) });

  test('ends when the channel has been below for as long as asked, and shows value, limit and time left meanwhile', async () => {
    const bench = await running(withSteps(wait), cooling(200));
    await bench.pass(100);
    expect(bench.driver.facts().waiting).toMatchObject({
      kind: 'wait',
      otherwise: 'hold',
      found: { met: false, samples: 'there', readings: [{ name: 'box temperature', value: 23, limit: 22, unit: 'degC', met: false }] },
    });
    await bench.pass(135);
    expect(state(bench)).toBe('running');
    await bench.pass(20);
    expect(state(bench)).toBe('finished');
    expect(eventOf(bench, 'condition-met')).toMatchObject({ path: '3.wait', readings: [{ value: 21.5, met: true }] });
    expect(brief(bench).slice(2)).toEqual(['wait done', 'mark done']);
  });

  test.each<['hold' | 'continue' | 'stop', string]>([
    ['hold', 'held'],
    ['continue', 'finished'],
    ['stop', 'stopped'],
  ])('gives up after its limit: %s', async (otherwise, end) => {
    const bench = await running(withSteps({ ...wait, otherwise }), cooling(1e9));
    await bench.pass(620);
    expect(state(bench)).toBe(end);
    expect(eventOf(bench, 'condition-not-met')).toMatchObject({ otherwise, samples: 'there' });
    if (end === 'finished') return;
    expect(bench.driver.facts().reason).toContain('Step 3.wait: The channel did not become quiet within 10 min.');
  });

  test('a channel that is silent is never met, also where its last samples were', async () => {
    const bench = await running(withSteps({ ...wait, otherwise: 'continue' }), { ...cooling(0), at: (t) => (t < 40 ? 21 : null) });
    await bench.pass(300);
    expect(bench.driver.facts().waiting?.found).toMatchObject({ met: false, samples: 'silent' });
  });

  test('held in between it begins anew; after its limit a resume goes on with the next step', async () => {
    const bench = await running(withSteps(wait), cooling(1e9));
    await bench.pass(100);
    bench.driver.hold('Ben');
    await bench.pass(5);
    expect(await bench.driver.resume('Ben')).toMatchObject({ ok: true });
    expect(brief(bench).slice(2)).toEqual(['wait cut short', 'wait null']);
    await bench.pass(605);
    expect(state(bench)).toBe('held');
    expect(await bench.driver.resume('Ben')).toMatchObject({ ok: true });
    await bench.pass(5);
    expect(state(bench)).toBe('finished');
  });

  test('a server that is killed meanwhile goes on waiting by the policy of the protocol, until the limit of before', async () => {
    const bench = await running({ ...withSteps(wait), onInterruption: 'resume' }, cooling(1e9));
    await bench.pass(100);
    await bench.restart(20);
    await bench.pass(60);
    expect(state(bench)).toBe('running');
    await bench.pass(440);
    expect(state(bench)).toBe('held');
  });
});

test('settle until calm waits for the drift to fall, whatever the pendulum still swings', async () => {
  /** Creep of 400 µrad/h that falls by half in 20 min, under a free swing of a milliradian (demo rig: 420 s). */
  const creep = (t: number) => 1e-6 * 400 * 0.4809 * (1 - Math.exp(-t / 1731));
  const deflection: Signal = {
    name: 'deflection',
    unit: 'rad',
    at: (t) => creep(t) + 1e-3 * Math.exp(-t / 1067) * Math.cos((2 * Math.PI * t) / 420),
  };
  const step: Step = { kind: 'settle', calmWhen: { drift_urad_per_h: 100, window_s: 630 }, atMost_s: 7200 };
  const bench = await running(withSteps(step), deflection);
  await bench.pass(1500);
  const [reading] = bench.driver.facts().waiting?.found?.readings ?? [];
  expect(reading).toMatchObject({ name: 'drift', limit: 100, unit: 'µrad/h', met: false });
  await bench.pass(3000, () => state(bench) === 'finished');
  // By hand: 400 µrad/h · e^(−t/1731 s) is 100 µrad/h at t = 2400 s; the window looks back 315 s on average.
  const endS = ((bench.store.log()[2]?.endUtcMs ?? 0) - startUtcMs) / 1000;
  expect(endS).toBeGreaterThan(2500);
  expect(endS).toBeLessThan(2900);
});

describe('a prompt', () => {
  const prompt: Step = { kind: 'prompt', text: 'Hands clear', atMost_s: 1800 };
  const protocol = withSteps(prompt, { kind: 'swing', to: 'far' });

  test('disarms, lets the door be opened, and goes on when the rig is armed again and somebody confirms', async () => {
    const bench = await running(protocol);
    expect(bench.performed.map((effect) => effect.kind)).toContain('void-arm');
    const arm = bench.arm.now;
    bench.arm.now = null;
    bench.link.openInterlock();
    await bench.pass(60);
    expect(state(bench)).toBe('running');
    expect(await bench.driver.requests.confirmPrompt('Ilse')).toEqual({ ok: false, why: 'The interlock is open: close the door first.' });
    bench.link.closeInterlock();
    await bench.pass(1);
    expect(await bench.driver.requests.confirmPrompt('Ilse')).toMatchObject({
      ok: false,
      why: expect.stringContaining('Arm it again at the rig'),
    });
    const moved = bench.link.motions.length;
    await bench.pass(60);
    expect(bench.link.motions).toHaveLength(moved);
    bench.arm.now = { name: 'Ilse', untilUtcMs: bench.clock.utcMs() + 1_000 };
    const short = {
      ok: false,
      why: expect.stringMatching(/^The arm of Ilse ends at .*, before the predicted finish at .* Arm the rig until after that\.$/),
    };
    expect(bench.driver.facts().waiting?.mayConfirm).toEqual(short);
    expect(await bench.driver.requests.confirmPrompt('Ilse')).toEqual(short);
    expect(bench.link.motions).toHaveLength(moved);
    bench.arm.now = arm;
    expect(bench.driver.facts().waiting?.mayConfirm).toEqual({ ok: true, why: '' });
    expect(await bench.driver.requests.confirmPrompt('Ilse')).toMatchObject({ ok: true });
    await bench.pass(30);
    expect(state(bench)).toBe('finished');
    expect(eventOf(bench, 'prompt-confirmed')).toMatchObject({ by: 'Ilse', path: '3.prompt' });
  });

  test('holds after its limit, and a resume asks again', async () => {
    const bench = await running(protocol);
    await bench.pass(1800);
    expect(bench.driver.facts()).toMatchObject({
      state: 'held',
      reason: expect.stringContaining('Nobody confirmed the prompt within 30 min'),
    });
    expect(await bench.driver.resume('Ben')).toMatchObject({ ok: true });
    expect(bench.driver.facts().waiting).toMatchObject({ kind: 'prompt', text: 'Hands clear' });
  });
});

describe('dwells that are not good', () => {
  const beat = 60;
  const pair: Step[] = [
    { kind: 'swing', to: 'far' },
    { kind: 'dwell', for_s: beat },
    { kind: 'swing', to: 'near' },
    { kind: 'dwell', for_s: beat },
  ];
  const hot = (fromS: number, toS: number): Signal => ({
    name: 'box temperature',
    unit: 'degC',
    at: (t) => (t > fromS && t < toS ? 30 : 20),
  });
  const judged = (repeat: Step): ProtocolDocument => ({
    ...withSteps(repeat),
    goodWhen: { channels: [{ channel: 'box temperature', below: 25 }] },
  });
  const dwells = (bench: Bench) => bench.store.log().filter(({ kind }) => kind === 'dwell');

  test('are marked with their reason, and a repeat that counts good passes makes up for them at the same cadence', async () => {
    const bench = await running(judged({ kind: 'repeat', times: 3, counting: 'good', atMost: 6, steps: pair }), hot(180, 190));
    await bench.pass(1000);
    expect(state(bench)).toBe('finished');
    expect(dwells(bench).map(({ good }) => good)).toEqual([true, true, false, true, true, true, true, true]);
    expect(bench.driver.facts()).toMatchObject({ dwellsDone: 8, dwellsGood: 7 });
    expect(eventOf(bench, 'dwell-not-good')).toMatchObject({ why: ['box temperature 30 degC, not below 25 degC'] });
    const starts = bench.store.log().filter(({ kind }) => kind === 'swing');
    const beats = starts.slice(2).map(({ startUtcMs: at }, index) => at - (starts[index + 1]?.startUtcMs ?? 0));
    expect(Math.max(...beats) - Math.min(...beats)).toBeLessThan(1);
  });

  test('a hold after the last dwell of a pass makes no good pass of it', async () => {
    const bench = await running(judged({ kind: 'repeat', times: 2, counting: 'good', atMost: 3, steps: pair }), hot(100, 110));
    await bench.pass(200, () => bench.driver.facts().current?.path.endsWith('repeat[1].4.dwell') === true);
    bench.driver.holdAfterDwell('Ben');
    await bench.pass(120, () => state(bench) === 'held');
    expect(dwells(bench).map(({ good }) => good)).toEqual([true, false]);
    expect(await bench.driver.resume('Ben')).toMatchObject({ ok: true });
    await bench.pass(1000);
    expect(state(bench)).toBe('finished');
    expect(dwells(bench).map(({ good }) => good)).toEqual([true, false, true, true, true, true]);
  });

  test('at most so many passes are made', async () => {
    const bench = await running(judged({ kind: 'repeat', times: 2, counting: 'good', atMost: 3, steps: pair }), hot(0, 1e9));
    await bench.pass(1000);
    expect(dwells(bench)).toHaveLength(6);
    expect(bench.driver.facts()).toMatchObject({ state: 'finished', dwellsDone: 6, dwellsGood: 0 });
  });
});

test('a proof without any deflection says so to whoever waits for it, and the run goes on', async () => {
  const bench = await running(
    withSteps(
      { kind: 'dwell', for_s: 60 },
      { kind: 'swing', to: 'far' },
      { kind: 'dwell', for_s: 60 },
      { kind: 'proof', otherwise: 'hold' },
    ),
  );
  await bench.pass(300, () => state(bench) === 'finished');
  expect(state(bench)).toBe('finished');
  expect(eventOf(bench, 'proof-not-possible')).toMatchObject({ path: '6.proof' });
  expect(bench.performed).toContainEqual(
    expect.objectContaining({
      kind: 'notify',
      topic: 'proved',
      text: expect.stringContaining('no deflection came in while the dwells went on'),
    }),
  );
});
