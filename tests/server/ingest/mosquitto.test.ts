import { openMqttLine } from '@/server/ingest/mqtt-line';
import type { BrokerMessage, BrokerSetting } from '@/server/interfaces/broker-line';
import { Mosquitto } from '@/tests/support/mosquitto';

/** The subscriber against a broker that is not ours: Debian's Mosquitto, with TLS. */

let broker: Mosquitto;
beforeAll(async () => {
  broker = await Mosquitto.start();
}, 30_000);
afterAll(() => broker.stop());

const signIn = () => ({ userName: broker.userName, password: broker.password });
const setting = (part: Partial<BrokerSetting> = {}): BrokerSetting => ({
  ...{ address: broker.address, clientId: 'evenfalltest', filters: ['lab/+/air'], ca: broker.ca },
  ...signIn(),
  ...part,
});

/** A line with all that it tells, each to be waited for. */
function listen(part: Partial<BrokerSetting> = {}) {
  const messages: BrokerMessage[] = [];
  let told: (what: string) => void;
  const first = new Promise<string>((resolve) => (told = resolve));
  let gone: (why: string) => void;
  const away = new Promise<string>((resolve) => (gone = resolve));
  let heard: () => void;
  const message = new Promise<void>((resolve) => (heard = resolve));
  const line = openMqttLine(setting(part), {
    connected: () => told('connected'),
    away: (why) => (told(why), gone(why)),
    message: (one) => (messages.push(one), heard()),
  });
  return { line, first, away, message, messages };
}

test('a broker whose certificate the lab’s own authority signed is heard', async () => {
  const { line, first, message, messages } = listen();
  expect(await first).toBe('connected');
  await broker.say('lab/cellar/air', '{"v": 12.5}');
  await message;
  expect(messages.map(({ topic, payload, retained }) => [topic, Buffer.from(payload).toString(), retained])).toEqual([
    ['lab/cellar/air', '{"v": 12.5}', false],
  ]);
  line.close();
});

test.each<[string, () => Partial<BrokerSetting>, RegExp]>([
  ['an authority that this server does not know', () => ({ ca: null }), /nobody whom this server trusts vouches for its certificate/],
  [
    'a certificate for another name',
    () => ({ address: `mqtts://127.0.0.1:${String(broker.port)}` }),
    /for another host than this address names/,
  ],
  ['a wrong password', () => ({ password: 'open-the-box' }), /refused the name or the password/],
  ['no password', () => ({ userName: null, password: null }), /refused the name or the password/],
])('%s is told in words', async (_, part, words) => {
  expect(await listen(part()).first).toMatch(words);
});

test('a broker that vanishes is told, and is there again for the next line', async () => {
  const before = listen();
  expect(await before.first).toBe('connected');
  await broker.vanish();
  expect(await before.away).toMatch(/closed the connection|ECONNRESET/);
  expect(await listen().first).toBe('nothing listens at this address');
  await broker.again();
  const after = listen();
  expect(await after.first).toBe('connected');
  after.line.close();
});
