import { FLAG, UNTAUGHT_LIMITS, type Order } from '@/firmware-protocol/codec';
import { limits, MachinePeer } from './machine-peer';

const code = (reply: { body: unknown }) => (reply.body as { code?: string }).code ?? 'ok';
const teach = (more: Partial<typeof limits> = {}): Order => ({ word: 'teach', ...limits, ...more });
const nudge = (peer: MachinePeer, steps: number): Order => ({ word: 'nudge', tag: peer.tag(), steps });
/** ⌈3400 / 36⌉ (SPEC 8.9). */
const LONGEST = 95;

describe('nudges (SPEC 8.8, 8.9)', () => {
  test('turn at home speed by so many microsteps from where the table stands, in either direction', () => {
    const peer = new MachinePeer({ startSteps: 300 }).greet();
    expect(peer.ask(nudge(peer, 50)).body).toMatchObject({ word: 'ok', state: 'moving' });
    peer.pass(1_500).renew();
    peer.ask(nudge(peer, -80));
    peer.pass(1_500);
    expect(peer.happened()).toEqual(['began 300', 'ended 350 done', 'began 350', 'ended 270 done']);
    // 50 microsteps at 100/s with ramps of 600/s²: s/v + v/a.
    const [began, ended] = peer.events().map(({ atUs }) => atUs) as [number, number];
    expect((ended - began) / 1e6).toBeCloseTo(50 / 100 + 100 / 600, 4);
  });

  test('need no known position, switch the drivers on, and leave the position unknown', () => {
    const peer = new MachinePeer({ homed: false, startSteps: -40 }).greet();
    expect(peer.status().flags & FLAG.driversOn).toBe(0);
    peer.ask(nudge(peer, 60));
    peer.pass(1_500);
    // The pass of the home edge on the way is told, without a count.
    expect(peer.happened()).toEqual(['began ', 'edge  ccw', 'ended  done']);
    expect(peer.machine.motion.track.at(peer.us).position).toBe(20);
    expect(peer.status()).toMatchObject({ state: 'rest', position: null });
    expect(peer.status().flags & FLAG.driversOn).toBe(FLAG.driversOn);
  });

  test('may leave the soft limits, which no move may', () => {
    const peer = new MachinePeer({ startSteps: 1_690 }).greet();
    expect(code(peer.ask(peer.move(1_720)))).toBe('travel');
    expect(code(peer.ask(nudge(peer, 30)))).toBe('ok');
    peer.pass(1_500);
    expect(peer.status().position).toBe(1_720);
  });

  test('are at most a 36th of the travel, and not nothing', () => {
    const peer = new MachinePeer().greet();
    for (const steps of [0, LONGEST + 1, -LONGEST - 1])
      expect(peer.ask(nudge(peer, steps)).body).toMatchObject({ word: 'no', code: 'travel', detail: LONGEST });
    expect(code(peer.ask(nudge(peer, -LONGEST)))).toBe('ok');
  });

  test('are refused with the arm key off, before anything about the machine is said', () => {
    const peer = new MachinePeer().greet();
    peer.machine.setInput('key', false, peer.us);
    peer.machine.setInput('interlock', false, peer.us);
    expect(code(peer.ask(nudge(peer, 500)))).toBe('key');
    peer.machine.setInput('key', true, peer.us);
    expect(code(peer.ask(nudge(peer, 500)))).toBe('interlock');
    peer.machine.setInput('interlock', true, peer.us);
    expect(code(peer.ask(nudge(peer, 500)))).toBe('lease');
    peer.renew();
    expect(code(peer.ask(nudge(peer, 500)))).toBe('travel');
  });

  test('are warned of like every first motion, ended by a stop, and refused until the next hello', () => {
    const peer = new MachinePeer({ warned: false }).greet();
    expect(peer.ask(nudge(peer, 90)).body).toMatchObject({ word: 'ok', state: 'waiting' });
    peer.passRenewing(10_200);
    expect(peer.happened()).toEqual(['warn', 'began 0']);
    peer.ask({ word: 'stop', drivers: 'keep' });
    peer.pass(1_000);
    expect(peer.happened()[2]).toMatch(/^ended \d+ stop$/);
    expect(code(peer.ask(nudge(peer, 1)))).toBe('stopped');
  });

  test('end with the lease like every motion', () => {
    const peer = new MachinePeer().greet();
    peer.pass(1_900);
    peer.ask(nudge(peer, 90));
    peer.pass(2_000);
    expect(peer.happened()).toEqual(['began 0', expect.stringMatching(/^lease \d+$/), expect.stringMatching(/^ended \d+ lease$/)]);
  });
});

describe('teaching (SPEC 8.10, 8.11)', () => {
  test('replaces limits, caps and home speed for good, and leaves the position known', () => {
    const peer = new MachinePeer({ startSteps: 5 }).greet();
    const narrow = { least: -50, greatest: 60, speed: 90_000, acceleration: 70_000, home: 40_000 };
    expect(peer.ask(teach(narrow)).body).toEqual({ word: 'lim', ...narrow });
    expect(peer.status()).toMatchObject({ position: 5 });
    expect(peer.ask(peer.move(61)).body).toMatchObject({ code: 'travel', detail: 60 });
    expect(peer.ask({ ...peer.move(60), speed: 90_001 } as Order).body).toMatchObject({ code: 'speed', detail: 90_000 });
    peer.machine.reset(peer.us, 'power');
    peer.pass(1_001).greet();
    expect(peer.ask({ word: 'limits' }).body).toEqual({ word: 'lim', ...narrow });
  });

  test('what is wrong in itself is refused as a field, and nothing is changed', () => {
    const peer = new MachinePeer().greet();
    for (const wrong of [{ least: 1_700 }, { least: 1_800 }, { home: 300_001 }])
      expect(peer.ask(teach(wrong)).body).toMatchObject({ code: 'field' });
    expect(peer.ask({ word: 'limits' }).body).toEqual({ word: 'lim', ...limits });
  });

  test('needs rest and the arm key, and caps that the controller can keep', () => {
    const peer = new MachinePeer().greet();
    peer.ask(peer.move(300));
    peer.machine.setInput('key', false, peer.us);
    expect(code(peer.ask(teach()))).toBe('busy');
    peer.passRenewing(3_000);
    expect(code(peer.ask(teach()))).toBe('key');
    peer.machine.setInput('key', true, peer.us);
    expect(peer.ask(teach({ speed: 8_000_001 })).body).toMatchObject({ code: 'speed', detail: 8_000_000 });
    expect(code(peer.ask(teach({ speed: 8_000_000 })))).toBe('ok');
  });

  test('a repeated lesson gets the stored reply, also after another one', () => {
    const peer = new MachinePeer().greet();
    const lesson = peer.text(teach({ least: -10 }));
    const [reply] = peer.put(lesson);
    expect(peer.put(lesson)).toEqual([reply]);
  });

  test('untaught, the travel is short and slow', () => {
    // SPEC 8.11: −3600 to 3600 microsteps, 200 microsteps/s, 200 microsteps/s², home speed 100 microsteps/s.
    expect(UNTAUGHT_LIMITS).toEqual({ least: -3600, greatest: 3600, speed: 200_000, acceleration: 200_000, home: 100_000 });
  });
});
