import { FLAG } from '@/firmware-protocol/codec';
import { limits, MachinePeer } from './machine-peer';

const code = (reply: { body: unknown }) => (reply.body as { code?: string }).code ?? 'ok';

describe('sessions, numbers and epochs (SPEC 3)', () => {
  test('a request without a session, or of another, is refused and does nothing', () => {
    const peer = new MachinePeer();
    expect(code(peer.ask({ word: 'renew' }))).toBe('session');
    peer.greet();
    expect(code(peer.ask({ word: 'renew' }, { session: 'ABCDABCD' }))).toBe('session');
  });

  test('session identifiers differ between sessions and starts', () => {
    const peer = new MachinePeer();
    const seen = new Set<string>();
    for (let start = 0; start < 3; start += 1) {
      for (let hello = 0; hello < 3; hello += 1) seen.add(peer.greet().session);
      peer.machine.reset(peer.us, 'power');
      peer.pass(1_001);
    }
    expect(seen.size).toBe(9);
  });

  test('an older epoch is fenced off for good, over a restart too', () => {
    const peer = new MachinePeer().greet(9);
    expect(peer.ask({ word: 'hello', major: 1, minor: 0 }, { epoch: 8, number: 1 }).body).toMatchObject({
      word: 'no',
      code: 'epoch',
      detail: 9,
    });
    expect(code(peer.ask({ word: 'status' }, { epoch: 8 }))).toBe('epoch');
    peer.machine.reset(peer.us, 'watchdog');
    peer.pass(1_001);
    expect(code(peer.ask({ word: 'hello', major: 1, minor: 0 }, { epoch: 8, number: 2 }))).toBe('epoch');
    expect(code(peer.ask({ word: 'hello', major: 1, minor: 0 }, { epoch: 9, number: 3 }))).toBe('ok');
  });

  test('numbers go round at 65536', () => {
    const peer = new MachinePeer().greet();
    for (const number of [30_000, 60_000, 65_535, 0, 5]) expect(code(peer.ask({ word: 'status' }, { number }))).toBe('ok');
    expect(code(peer.ask({ word: 'status' }, { number: 65_535 }))).toBe('old');
  });

  test('a repeated order is answered byte for byte as before and done once, also after its motion', () => {
    const peer = new MachinePeer().greet();
    const order = peer.text(peer.move(500));
    const [reply] = peer.put(order).filter((line) => line.startsWith('r '));
    peer.passRenewing(0).pass(5);
    expect(peer.put(order)).toEqual([reply]);
    peer.pass(1_900);
    expect(peer.put(order)).toEqual([reply]);
    expect(peer.happened().filter((what) => what.startsWith('began'))).toHaveLength(1);
  });

  test('a repeated renewal renews nothing (10.1)', () => {
    const peer = new MachinePeer().greet();
    const renewal = peer.text({ word: 'renew' });
    peer.put(renewal);
    peer.pass(1_500);
    peer.put(renewal);
    peer.pass(600);
    expect(peer.status().flags & FLAG.leaseLive).toBe(0);
  });

  test('an order under a new number, but with the tag of the last one, is not carried out again', () => {
    const peer = new MachinePeer().greet();
    const order = peer.move(100, null, '000000AA');
    expect(code(peer.ask(order))).toBe('ok');
    peer.pass(1_500).renew();
    expect(code(peer.ask(order))).toBe('repeat');
    peer.greet();
    expect(code(peer.ask(order))).toBe('repeat');
  });

  test('spoilt lines are dropped, counted, and answered by nothing', () => {
    const peer = new MachinePeer().greet();
    const line = peer.text(peer.move(500));
    expect(peer.put(line.replace('500', '501'))).toEqual([]);
    expect(peer.put('\u00ff\u0000')).toEqual([]);
    expect(peer.put('')).toEqual([]);
    expect(peer.status()).toMatchObject({ state: 'rest', dropped: 2 });
  });
});

describe('what a move needs (SPEC 8.5, 12.2)', () => {
  test.each([
    ['travel', (peer: MachinePeer) => peer.move(1_701), limits.greatest],
    ['travel', (peer: MachinePeer) => peer.move(-1_701), limits.least],
    ['speed', (peer: MachinePeer) => ({ ...peer.move(10), speed: limits.speed + 1 }), limits.speed],
    ['ramp', (peer: MachinePeer) => ({ ...peer.move(10), acceleration: limits.acceleration + 1 }), limits.acceleration],
    ['past', (peer: MachinePeer) => peer.move(10, -3), 3],
    ['far', (peer: MachinePeer) => peer.move(10, 60_001), 60_000],
  ])('refused: %s', (awaited, order, detail) => {
    const peer = new MachinePeer().greet();
    peer.pass(10);
    expect(peer.ask(order(peer) as ReturnType<MachinePeer['move']>).body).toMatchObject({ word: 'no', code: awaited, detail });
    expect(peer.events()).toEqual([]);
  });

  test('at the limits themselves it is accepted', () => {
    for (const position of [limits.least, limits.greatest])
      expect(code(new MachinePeer().greet().ask(new MachinePeer().move(position)))).toBe('ok');
  });

  test('refused: lease, interlock, supply, unknown, busy, stopped', () => {
    const peer = new MachinePeer().greet();
    expect(code(peer.ask(peer.move(300)))).toBe('ok');
    expect(code(peer.ask(peer.move(10)))).toBe('busy');
    peer.ask({ word: 'stop', drivers: 'keep' });
    peer.pass(2_000);
    expect(code(peer.ask(peer.move(10)))).toBe('stopped');
    peer.greet();
    peer.pass(2_000);
    expect(code(peer.ask(peer.move(10)))).toBe('lease');
    peer.machine.setInput('interlock', false, peer.us);
    peer.renew();
    expect(code(peer.ask(peer.move(10)))).toBe('interlock');
    peer.machine.setInput('interlock', true, peer.us);
    peer.machine.setInput('supply', false, peer.us);
    expect(code(peer.ask(peer.move(10)))).toBe('supply');
    peer.machine.setInput('supply', true, peer.us);
    expect(code(peer.ask(peer.move(10)))).toBe('unknown');
  });
});

describe('a waiting move (SPEC 8.2 to 8.4)', () => {
  test('makes its first step at its stamp, to the microsecond', () => {
    const peer = new MachinePeer().greet();
    peer.ask(peer.move(100, 1_234));
    peer.passRenewing(3_000);
    const began = peer.events().find(({ what }) => what.word === 'began');
    expect(began?.atUs).toBe(61_234_000);
  });

  const cancels: [string, string, (peer: MachinePeer) => void][] = [
    ['hold', 'hold', (peer) => void peer.ask({ word: 'hold' })],
    ['stop', 'stop', (peer) => void peer.ask({ word: 'stop', drivers: 'keep' })],
    ['off', 'off', (peer) => void peer.ask({ word: 'off' })],
    ['interlock opening', 'interlock', (peer) => peer.machine.setInput('interlock', false, peer.us)],
    ['loss of supply', 'supply', (peer) => peer.machine.setInput('supply', false, peer.us)],
    ['lapse of the lease', 'lease', (peer) => void peer.pass(2_500)],
    ['a new session', 'session', (peer) => void peer.greet()],
    ['a new epoch', 'session', (peer) => void peer.greet(8)],
  ];
  test.each(cancels)('is cancelled by %s, with an event and without a step', (_name, cause, cancel) => {
    const peer = new MachinePeer().greet();
    peer.ask(peer.move(500, 5_000));
    peer.pass(100);
    cancel(peer);
    peer.passRenewing(8_000);
    const causes = peer.events().map(({ what }) => (what.word === 'ended' ? what.cause : what.word));
    expect(causes).toContain(cause);
    expect(causes).not.toContain('began');
    expect(peer.machine.motion.track.at(peer.us).position).toBe(0);
  });

  test('is cancelled by a reset', () => {
    const peer = new MachinePeer().greet();
    peer.ask(peer.move(500, 5_000));
    peer.machine.reset(peer.us, 'brownout');
    peer.pass(1_100);
    peer.greet();
    peer.passRenewing(8_000);
    expect(peer.happened()).toEqual(['boot brownout']);
    expect(peer.machine.motion.track.at(peer.us).position).toBe(0);
  });
});

describe('stops (SPEC 9)', () => {
  test('need no session, no epoch and no fitting number, and work in every state', () => {
    for (const word of ['hold', 'off'] as const) {
      const peer = new MachinePeer().greet();
      peer.ask(peer.move(1_500));
      peer.pass(700);
      expect(peer.ask({ word }, { session: '00000000', epoch: 0, number: 3 }).body).toMatchObject({
        word: 'ok',
        state: word === 'hold' ? 'braking' : 'rest',
      });
      peer.passRenewing(3_000);
      expect(peer.status().state).toBe('rest');
    }
  });

  test('hold decelerates as the motion accelerates, stop with the cap, both to a whole microstep', () => {
    const slow = { speed: 200_000, acceleration: 100_000 };
    const lengths = (['hold', 'stop'] as const).map((word) => {
      const peer = new MachinePeer().greet();
      peer.ask({ ...peer.move(1_500), ...slow } as ReturnType<MachinePeer['move']>);
      peer.passRenewing(3_000);
      peer.ask(word === 'hold' ? { word } : { word, drivers: 'keep' });
      const from = peer.us;
      peer.pass(4_000);
      const ended = peer.events().find(({ what }) => what.word === 'ended');
      expect(Number.isInteger(ended?.what.word === 'ended' && ended.what.position)).toBe(true);
      return ((ended?.atUs ?? 0) - 60e6 - from) / 1e6;
    });
    // From 200 steps/s: 2 s at 100 steps/s², 1/3 s at 600.
    expect(lengths[0]).toBeCloseTo(2, 1);
    expect(lengths[1]).toBeCloseTo(1 / 3, 1);
  });

  test('an order that was sent before a stop and arrives after it is old', () => {
    const peer = new MachinePeer().greet();
    const overtaken = peer.text(peer.move(500));
    peer.ask({ word: 'hold' });
    expect(peer.put(overtaken)[0]).toContain(' no old ');
    peer.passRenewing(2_000);
    expect(peer.happened()).toEqual([]);
  });

  test('a repeated stop is answered again and stops nothing that was ordered after it', () => {
    const peer = new MachinePeer().greet();
    const hold = peer.text({ word: 'hold' });
    const first = peer.put(hold);
    expect(peer.put(hold)).toEqual(first);
  });

  test('stop free releases the drivers at rest, and the position is lost', () => {
    const peer = new MachinePeer().greet();
    peer.ask(peer.move(1_000));
    peer.passRenewing(1_000);
    peer.ask({ word: 'stop', drivers: 'free' });
    expect(peer.status().flags & FLAG.driversOn).not.toBe(0);
    peer.pass(2_000);
    expect(peer.status()).toMatchObject({ state: 'rest', position: null });
    expect(peer.status().flags & FLAG.driversOn).toBe(0);
  });
});

describe('a table that makes whole turns: its flag covers the half of each turn below the edge', () => {
  const turning = (startSteps: number) =>
    new MachinePeer({ limits: { ...limits, least: -7000, greatest: 7000 }, startSteps, turnSteps: 1600 }).greet();
  const edges = (peer: MachinePeer) => peer.happened().filter((what) => what.startsWith('edge'));

  test('the edge is passed in every turn, its other end half a turn on', () => {
    const peer = turning(0);
    peer.ask(peer.move(3300));
    peer.passRenewing(15_000);
    expect(edges(peer)).toEqual(['edge 800 cw', 'edge 1600 ccw', 'edge 2400 cw', 'edge 3200 ccw']);
    peer.ask(peer.move(-10));
    peer.passRenewing(15_000);
    expect(edges(peer).slice(4)).toEqual(['edge 3199 cw', 'edge 2399 ccw', 'edge 1599 cw', 'edge 799 ccw', 'edge -1 cw']);
  });

  test('homing meets the edge of the turn in which the table stands', () => {
    const peer = turning(1650);
    peer.ask({ word: 'home', tag: peer.tag() });
    peer.passRenewing(30_000);
    expect(peer.happened().find((what) => what.startsWith('homed'))).toBe('homed 1600');
  });
});
