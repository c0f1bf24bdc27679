import type { ChainedEvent } from '@/shared/archive/run-records';
import type { StepRowView } from '@/shared/contracts/runs';
import type { ProtocolDocument } from '@/shared/protocol/document';
import { demoRigWide } from '@/shared/rig/demo-rigs';
import { benchRig } from '../contract/link/bench';
import { ControllerProcess } from '@/scripts/soak/board/controller-process';
import { Hand, until } from './support/hand';
import { RealServer } from './support/real-server';

/**
 * In real time: a run that a browser starts goes through the server's own engine, link and serial port class, and a pseudo-terminal, to the
 * controller's firmware on the emulated board in a process of its own. The line is cut in the middle of a dwell and comes back; the run goes on,
 * and the log shows the gap.
 */

jest.setTimeout(120_000);
let server: RealServer;
let controller: ControllerProcess;
let hand: Hand;

const document: ProtocolDocument = {
  formatVersion: 1,
  name: 'Over the serial line',
  onInterruption: 'resume',
  steps: [
    { kind: 'home' },
    { kind: 'swing', to: 'near' },
    { kind: 'dwell', for_s: 2 },
    { kind: 'swing', to: 'far' },
    { kind: 'dwell', for_s: 12, label: 'cut here' },
    { kind: 'swing', to: 'near' },
    { kind: 'dwell', for_s: 2 },
  ],
};

beforeAll(async () => {
  controller = new ControllerProcess(['--board', '--homed'], { ...demoRigWide, stations: {}, motion: benchRig });
  await controller.start();
  server = await RealServer.start();
  hand = new Hand(await server.open('phone', 'keeper'));
}, 60_000);
afterAll(async () => {
  await hand.browser.close();
  await server.stop();
  await controller.dispose();
}, 30_000);

const ask: Hand['asks'] = (...request) => hand.asks(...request);

test('a run started in the browser drives the controller over a serial line, which is lost and found again', async () => {
  const rig = await ask('POST', '/rigs', {
    body: { name: 'Serial bench', document: { ...demoRigWide, motion: benchRig }, link: { kind: 'simulated' } },
  });
  const rigId = String(rig.body.id);
  const protocolId = String((await ask('POST', '/protocols', { body: { document } })).body.id);
  const { etag } = await ask('GET', `/protocols/${protocolId}`);
  await ask('POST', `/protocols/${protocolId}/revisions`, { body: { rigId, note: '' }, etag });

  await hand.goes(`/rigs/${rigId}/link`, 'link-screen');
  await hand.tapsOn('Serial line', 'radio');
  await hand.types('link-path', controller.path);
  await hand.taps('try-link');
  await hand.reads('try-result', /A controller answers at .*turntable: firmware .*Nothing was moved\./);
  await hand.shoots('serial-link');
  await hand.taps('save-link');
  await hand.at('rig-screen').waitFor();
  await hand.reads('rig-link-state', 'live');
  expect(server.services.stations.get(rigId)?.settings).toEqual({ kind: 'serial', path: controller.path, baudRate: 115_200 });

  await hand.asksToArm();
  await hand.reads('arming', 'Turn the arm key off first');
  await controller.tell('key off');
  await hand.reads('arming', 'Turn the arm key on');
  await controller.tell('key on');
  await hand.reads('armed-by', 'Armed by Casimir Thornquist');
  await hand.goes(`/rigs/${rigId}/start?protocol=${protocolId}`, 'start-screen');
  await until(() => hand.isEnabled('start-run'), 'the start to be allowed');
  await hand.keeps('start-run');
  await hand.at('run-screen').waitFor();
  const runId = new URL(hand.page.url()).pathname.split('/').at(-1) ?? '';

  await hand.reads('run-state', 'Dwell, far side');
  const { angleDeg } = JSON.parse(await controller.tell('angle')) as { angleDeg: number };
  expect(angleDeg).toBeCloseTo(-20.18, 1);
  await controller.unplug();
  await hand.reads('link-chip', 'lost');
  await hand.reads('lost-notice', /The server hears nothing from the controller/);
  await hand.shoots('serial-lost');
  await controller.plug();
  await hand.reads('link-chip', 'live');
  await hand.at('result-screen').waitFor({ timeout: 40_000 });
  await hand.reads('headline', 'Finished at');

  const { items: steps } = (await ask('GET', `/runs/${runId}/steps`)).body as { items: StepRowView[] };
  expect(steps.map(({ kind, outcome }) => `${kind} ${String(outcome)}`)).toEqual(document.steps.map(({ kind }) => `${kind} done`));
  const dwell = steps[4] as StepRowView;
  expect(((dwell.endUtcMs ?? NaN) - dwell.startUtcMs) / 1000).toBeCloseTo(12, 2);
  const { items: events } = (await ask('GET', `/runs/${runId}/events?limit=200`)).body as { items: ChainedEvent[] };
  const told = events.filter(({ kind }) => kind.startsWith('link') || kind === 'resumed');
  // On a busy machine the line may starve once more; each time it is found again and the run goes on.
  expect(told.map(({ kind }) => kind).join(' ')).toMatch(/^link-lost link-ready resumed( link-lost link-ready resumed)*$/);
  expect(told.at(-1)?.data).toMatchObject({ by: 'protocol', cause: 'link-lost', gapS: expect.any(Number) });

  await hand.tapsOn('Step log', 'link');
  await hand.at('step-log').waitFor();
  await hand.taps('events-5');
  await hand.sees('Link lost');
  // The port's end or, on a busy machine, the silence before it: whichever was noticed first.
  await hand.sees(String(told[0]?.data.why));
  await hand.sees('Link ready');
  await hand.page.getByText('Link lost').scrollIntoViewIfNeeded();
  await hand.shoots('serial-log');
  expect(hand.browser.errors).toEqual([]);
});
