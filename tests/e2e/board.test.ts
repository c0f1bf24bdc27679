import { demoIds } from '@/db/demo/seed';
import type { ProtocolDocument } from '@/shared/protocol/document';
import { Hand, until } from './support/hand';
import { RealServer } from './support/real-server';

/**
 * In real time: the demo's own line, the controller's firmware on the emulated board in a thread of the server. As a real board after power-on
 * it does not know its position: a person arms the rig, and the run that is started in the browser homes first.
 */

jest.setTimeout(120_000);
let server: RealServer;
let hand: Hand;

const document: ProtocolDocument = {
  formatVersion: 1,
  name: 'On the emulated board',
  steps: [{ kind: 'home' }, { kind: 'swing', to: 'near' }, { kind: 'dwell', for_s: 2 }],
};

beforeAll(async () => {
  server = await RealServer.start('board');
  hand = new Hand(await server.open('phone', 'keeper'));
}, 60_000);
afterAll(async () => {
  await hand.browser.close();
  await server.stop();
}, 30_000);

test('a newcomer is told that the position is unknown, arms the rig, starts, and the board homes and swings', async () => {
  const protocolId = String((await hand.asks('POST', '/protocols', { body: { document } })).body.id);
  const { etag } = await hand.asks('GET', `/protocols/${protocolId}`);
  await hand.asks('POST', `/protocols/${protocolId}/revisions`, { body: { rigId: demoIds.rig, note: '' }, etag });
  const link = () => server.services.stations.get(demoIds.rig)?.link;
  await until(() => link()?.health().condition === 'ready', 'the board to answer');
  expect(link()?.controller()).toMatchObject({ firmware: 'evenfall-1.0', positionKnown: false, driversOn: false });

  await hand.goes(`/rigs/${demoIds.rig}/start?protocol=${protocolId}`, 'start-screen');
  await hand.sees('Not known; the protocol homes first.');
  expect(await hand.isEnabled('start-run')).toBe(false);
  await hand.goes(`/rigs/${demoIds.rig}`, 'rig-screen');
  await hand.asksToArm();
  await hand.turnsVirtualKey();
  await hand.reads('armed-by', 'Armed by Casimir Thornquist');
  await hand.goes(`/rigs/${demoIds.rig}/start?protocol=${protocolId}`, 'start-screen');
  await until(() => hand.isEnabled('start-run'), 'the start to be allowed');
  await hand.keeps('start-run');
  await hand.at('run-screen').waitFor();
  await hand.at('result-screen').waitFor({ timeout: 90_000 });
  await hand.reads('headline', 'Finished at');
  expect(link()?.controller()).toMatchObject({ positionKnown: true, driversOn: true });
  // Near stands at 20.18°: on the nearest microstep of 44.4 to a degree.
  expect(link()?.controller()?.angleDeg).toBeCloseTo(20.18, 1);
  expect(hand.browser.errors).toEqual([]);
});
