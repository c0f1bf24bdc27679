import { demoIds } from '@/db/demo/seed';
import type { ProtocolDocument } from '@/shared/protocol/document';
import { chapters, Hand } from './support/hand';
import { labOfThisFile } from './support/lab';
import { issued, read, started } from './support/night';

/** A run that waits: until the pendulum is calm, then for a person; a proof; and a device that sends data. On a phone, the run also at a desk. */

jest.setTimeout(90_000);
const lab = labOfThisFile();
let hand: Hand;
let desk: Hand;
let runId: string;
const tell = chapters(() => hand);

const dwell = { kind: 'dwell', beat_periods: 1 } as const;
const waiting: ProtocolDocument = {
  formatVersion: 1,
  name: 'Waiting night',
  goodWhen: { residual_urad: 40 },
  evaluation: { method: 'equilibrium', drift: 'aba', channel: 'deflection' },
  steps: [
    { kind: 'home' },
    { kind: 'swing', to: 'near' },
    { kind: 'settle', calmWhen: { amplitude_urad: 30, drift_urad_per_h: 800, window_s: 420 }, atMost_s: 1800, otherwise: 'continue' },
    {
      kind: 'repeat',
      times: 3,
      counting: 'good',
      atMost: 5,
      steps: [{ kind: 'swing', to: 'far' }, dwell, { kind: 'swing', to: 'near' }, dwell],
    },
    { kind: 'proof', otherwise: 'continue' },
    { kind: 'prompt', text: 'Turn the balls by 90° and close the case', atMost_s: 3600 },
    { kind: 'swing', to: 'clear' },
  ],
};

beforeAll(async () => {
  hand = new Hand(await lab().open('phone', 'owner'));
  desk = new Hand(await lab().open('wide', 'owner'));
  await lab().server.arm(20);
  const protocol = await issued(lab(), waiting);
  runId = await started(lab(), protocol);
}, 60_000);
afterAll(() => expect([hand, desk].flatMap(({ browser }) => browser.errors)).toEqual([]));

/** What the phone shows, the desk shows too. */
const bothSee = async (look: (each: Hand) => Promise<void>) => {
  for (const each of [hand, desk]) {
    await each.goes(`/runs/${runId}`, 'run-screen');
    await look(each);
  }
};
const bothLookAway = () => Promise.all([hand.looksAway(), desk.looksAway()]);

tell('the pendulum is waited for: value, limit, and time left until it gives up', async () => {
  await lab().pass(500);
  await bothSee(async (each) => {
    await each.reads('waiting', /Until the pendulum is calm.*amplitude.*µrad.*below 30.*not yet.*drift.*below 800 µrad\/h/);
    await each.reads('gives-up', /Gives up at \d\d:\d\d, in \d+ min.*: then the run goes on all the same\./);
    await each.shoots('waiting-calm');
  });
});

tell('good dwells are counted, and what the run has reached is shown', async () => {
  await bothLookAway();
  await lab().pass(1800 + 4 * 420);
  await bothSee(async (each) => {
    await each.reads('reached', /\d of \d.*dwells good.*mrad.*near − far so far.*%.*u reached/);
    await each.shoots('u-reached');
  });
});

tell('a prompt disarms the rig; it is confirmed when the rig was armed again', async () => {
  await bothLookAway();
  await lab().pass(1700);
  await bothSee(async (each) => {
    await each.reads('waiting', 'Turn the balls by 90° and close the case');
    await each.reads('confirm-why', /Arm it again at the rig, then confirm/);
    expect(await each.isEnabled('confirm-prompt')).toBe(false);
    await each.shoots('prompt');
  });
  await desk.looksAway();
  await lab().server.arm(20);
  // The lab's clock went ahead of the page's.
  await hand.goes(`/runs/${runId}`, 'confirm-prompt');
  await hand.page.getByTestId('confirm-why').waitFor({ state: 'detached' });
  await hand.keeps('confirm-prompt');
  await lab().pass(30);
  await hand.at('result-screen').waitFor();
  await hand.reads('pairs', /3 of 3 pairs count/);
  await hand.shoots('pairs');
  const { items } = await read(lab(), `${runId}/events?limit=200`);
  const proof = (items as { kind: string; data: Record<string, unknown> }[]).find(({ kind }) => kind === 'proof');
  expect(proof?.data).toMatchObject({ sound: expect.any(Boolean) });
});

tell('a device gets a token that is shown once, and revoking it ends it', async () => {
  await hand.goes(`/rigs/${demoIds.rig}`, 'rig-screen');
  await hand.taps('add-device');
  await hand.types('device-name', 'Box thermometer');
  await hand.tapsOn('The room', 'radio');
  await hand.taps('make-device');
  const secret = await hand.reads('device-secret', /^[\w-]{40,}$/);
  await hand.shoots('device-made');
  await hand.taps('device-copied');
  const line = JSON.stringify({ time_utc: new Date(lab().server.clock.utcMs() - 1000).toISOString(), value: 21.3 });
  const answer = await fetch(`${lab().address}/api/samples`, {
    method: 'POST',
    headers: { authorization: `Bearer ${secret}`, 'content-type': 'application/x-ndjson' },
    body: line,
  });
  expect(await answer.json()).toEqual({ stored: 1, known: 0 });
  await hand.goes(`/rigs/${demoIds.rig}`, 'rig-screen');
  await hand.reads('devices', /box temperature, degC.*last sample.*Box thermometer.*last used/);
  await hand.at('devices').scrollIntoViewIfNeeded();
  await hand.shoots('devices');
  await hand.taps('revoke-device');
  await hand.taps('revoke-sure');
  await hand.page.getByTestId('device-token').waitFor({ state: 'detached' });
});

tell('a room that is too warm makes a dwell not good and never holds the run; the pair is made up', async () => {
  const device = { name: 'thermometer', channels: [{ name: 'air', role: 'environment', unit: 'degC', rateHz: 0.1 }] };
  const made = await lab().server.as('owner', 'POST', `/labs/${demoIds.lab}/rigs/${demoIds.rig}/devices`).send(device).expect(201);
  const tells = async (value: number) => {
    const line = JSON.stringify({ time_utc: new Date(lab().server.clock.utcMs() - 1).toISOString(), value });
    const headers = { authorization: `Bearer ${String(made.body.secret)}`, 'content-type': 'application/x-ndjson' };
    expect((await fetch(`${lab().address}/api/samples`, { method: 'POST', headers, body: line })).status).toBe(200);
  };
  await tells(21);
  await lab().server.arm(20);
  const warmId = await started(
    lab(),
    await issued(lab(), {
      formatVersion: 1,
      name: 'Warm room',
      goodWhen: { channels: [{ channel: 'air', below: 22 }] },
      evaluation: { method: 'equilibrium', drift: 'aba', channel: 'deflection' },
      steps: [
        { kind: 'home' },
        { kind: 'swing', to: 'near' },
        {
          kind: 'repeat',
          times: 1,
          counting: 'good',
          atMost: 3,
          steps: [{ kind: 'swing', to: 'far' }, dwell, { kind: 'swing', to: 'near' }, dwell],
        },
      ],
    }),
  );
  await hand.goes(`/runs/${warmId}`, 'run-screen');
  const state = async (): Promise<string> => (await read(lab(), warmId)).state;
  const seen = new Set<string>();
  for (let strides = 0; strides < 80 && (await state()) !== 'finished'; strides += 1) {
    // Too warm in the first pair.
    await tells(strides < 12 ? 23.5 : 21);
    await lab().pass(40);
    seen.add(await state());
  }
  expect([...seen]).toEqual(['running', 'finished']);
  await hand.at('result-screen').waitFor();
  await hand.reads('good-dwells', /^[23] of 4/);
  const { items } = await read(lab(), `${warmId}/steps`);
  const dwells = (items as { kind: string; good: boolean | null }[]).filter(({ kind }) => kind === 'dwell').map(({ good }) => good);
  expect(dwells[0]).toBe(false);
  expect(dwells.slice(-2)).toEqual([true, true]);
  expect(dwells).toHaveLength(4);
  await hand.goes(`/runs/${warmId}/log`, 'step-log');
  await hand.sees(/not good/);
  await hand.shoots('made-up');
});

tell('the editor offers what can be waited for', async () => {
  const { body } = await hand.asks('POST', '/protocols', { body: { document: waiting } });
  await hand.goes(`/protocols/${String(body.id)}`, 'editor');
  for (const [step, name] of [
    [3, 'edit-settle'],
    [4, 'edit-repeat'],
    [5, 'edit-proof'],
    [6, 'edit-prompt'],
  ] as const) {
    await hand.taps(`step-${String(step)}`);
    await hand.taps(`step-${String(step)}`);
    await hand.at('step-details').waitFor();
    await hand.shoots(name);
    await hand.taps('sheet-close');
    await hand.at('step-details').waitFor({ state: 'detached' });
  }
  await desk.goes(`/protocols/${String(body.id)}`, 'good-when');
  await desk.shoots('edit-protocol');
  await desk.follows(`/rigs/${demoIds.rig}`, 'devices');
  await desk.shoots('devices');
});
