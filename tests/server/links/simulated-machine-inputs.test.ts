import { FLAG } from '@/firmware-protocol/codec';
import { MachinePeer } from './machine-peer';

const code = (reply: { body: unknown }) => (reply.body as { code?: string }).code ?? 'ok';

describe('lease, inputs and warning (SPEC 10, 11)', () => {
  test.each([0, 300, 900, 1_700, 2_400, 3_900, 5_000, 5_600, 6_500])(
    'where the table comes to rest if it is left after %d ms is told before',
    (leftAtMs) => {
      const peer = new MachinePeer({ backlashSteps: 3 }).greet();
      peer.ask(peer.move(-1_600));
      peer.passRenewing(leftAtMs);
      const { steps, known } = peer.machine.ifLeft(peer.us);
      peer.pass(10_000);
      expect(peer.machine.motion.state).toBe('rest');
      expect(steps).toBeCloseTo(peer.machine.motion.tableAt(peer.us), 6);
      expect(known).toBe(true);
    },
  );

  test('a lease that lapses in motion ends it with a ramp; the lease lapses at 2.0 s', () => {
    const peer = new MachinePeer().greet();
    peer.ask({ ...peer.move(1_600), speed: 200_000 } as ReturnType<MachinePeer['move']>);
    peer.pass(5_000);
    const [, lease, ended] = peer.events();
    expect(lease).toMatchObject({ what: { word: 'lease' }, atUs: 62e6 });
    expect(ended).toMatchObject({ what: { word: 'ended', cause: 'lease' } });
    expect(((ended?.atUs as number) - 62e6) / 1e6).toBeCloseTo(1 / 3, 2);
  });

  test('interlock: opening brakes, closing starts nothing, and a warning of 10 s comes before the next motion', () => {
    const peer = new MachinePeer().greet();
    peer.ask(peer.move(1_600));
    peer.passRenewing(1_500);
    peer.machine.setInput('interlock', false, peer.us);
    peer.passRenewing(3_000);
    peer.machine.setInput('interlock', true, peer.us);
    peer.passRenewing(3_000);
    expect(peer.happened()).toEqual(['began 0', 'interlock false', expect.stringMatching(/^ended \d+ interlock$/), 'interlock true']);
    expect(peer.status().flags & FLAG.warningDue).not.toBe(0);
    expect(peer.ask(peer.move(0, 3_000)).body).toMatchObject({ word: 'no', code: 'warning', detail: 10_000 });
    peer.renew();
    const orderedUs = 60e6 + peer.us;
    expect(peer.ask(peer.move(0)).body).toMatchObject({ word: 'ok', state: 'waiting' });
    peer.passRenewing(16_000);
    const began = peer.events().filter(({ what }) => what.word === 'began')[1];
    expect(began?.atUs).toBe(orderedUs + 10e6);
    expect(peer.happened().slice(4)).toEqual(['warn', expect.stringMatching(/^began/), 'ended 0 done']);
    expect(peer.status().flags & FLAG.warningDue).toBe(0);
  });

  test('supply: pulses end at once, the position is lost, the return starts nothing', () => {
    const peer = new MachinePeer().greet();
    peer.ask(peer.move(1_600));
    peer.passRenewing(1_500);
    const before = Math.floor(peer.machine.motion.track.at(peer.us).position);
    peer.machine.setInput('supply', false, peer.us);
    peer.passRenewing(1_000);
    peer.machine.setInput('supply', true, peer.us);
    peer.passRenewing(1_000);
    expect(peer.happened().slice(1)).toEqual(['supply false', 'ended  supply', 'supply true']);
    expect(peer.machine.motion.track.at(peer.us).position).toBe(before);
    expect(peer.status()).toMatchObject({ position: null });
  });

  test('the arm key is told and hinders nothing', () => {
    const peer = new MachinePeer().greet();
    peer.machine.setInput('key', false, peer.us);
    expect(peer.happened()).toEqual(['key false']);
    expect(code(peer.ask(peer.move(10)))).toBe('ok');
  });
});

describe('home and its flag (SPEC 8.6, 11.4)', () => {
  test.each([-1_500, -3, -1, 0, 1, 2, 1_600])(
    'from %i steps ends at 0, having come counter-clockwise, without leaving the middle',
    (startSteps) => {
      const peer = new MachinePeer({ homed: false, startSteps }).greet();
      expect(code(peer.ask({ word: 'home', tag: peer.tag() }))).toBe('ok');
      peer.passRenewing(40_000);
      expect(peer.status()).toMatchObject({ state: 'rest', position: 0 });
      expect(peer.machine.motion.track.at(peer.us).position).toBe(0);
      const edges = peer.events().flatMap(({ what }) => (what.word === 'edge' ? [what.direction] : []));
      expect(edges.at(-1)).toBe('ccw');
      expect(peer.happened().slice(-2)).toEqual(['homed ', 'ended 0 done']);
      // Towards the middle only: v²/2a = 8.3 steps past the edge, and 8 more below it.
      for (let us = 0; us < 40e6; us += 5e4) {
        const { position } = peer.machine.motion.track.at(us);
        expect(position).toBeGreaterThanOrEqual(Math.min(startSteps, -20));
        expect(position).toBeLessThanOrEqual(Math.max(startSteps, 20));
      }
    },
  );

  test('tells how far the count had gone wrong', () => {
    const peer = new MachinePeer().greet();
    peer.machine.motion.slip(4, peer.us);
    peer.ask({ word: 'home', tag: peer.tag() });
    peer.passRenewing(10_000);
    expect(peer.events().find(({ what }) => what.word === 'homed')).toMatchObject({ what: { position: -4 } });
    expect(peer.status().position).toBe(0);
  });

  test('every pass of the edge in a move is an event with count and direction', () => {
    const peer = new MachinePeer().greet();
    for (const position of [500, -500, 500]) {
      peer.ask(peer.move(position));
      peer.passRenewing(6_000);
    }
    expect(peer.happened().filter((what) => what.startsWith('edge'))).toEqual(['edge -1 cw', 'edge 0 ccw']);
  });
});

describe('what lies between motor and table', () => {
  const edges = (peer: MachinePeer) => peer.happened().filter((what) => what.startsWith('edge'));

  test('with play, clockwise passes are counted later by it, and the table is ahead by it', () => {
    const peer = new MachinePeer({ backlashSteps: 5 }).greet();
    for (const position of [500, -500, 500]) {
      peer.ask(peer.move(position));
      peer.passRenewing(6_000);
      const { motion } = peer.machine;
      expect(motion.tableAt(peer.us)).toBe(position + (position < 0 ? 5 : 0));
    }
    expect(edges(peer)).toEqual(['edge -6 cw', 'edge 0 ccw']);
  });

  test('with play, homing still ends at the edge met counter-clockwise', () => {
    const peer = new MachinePeer({ backlashSteps: 5, homed: false, startSteps: 300 }).greet();
    peer.ask({ word: 'home', tag: peer.tag() });
    peer.passRenewing(20_000);
    expect(peer.status()).toMatchObject({ state: 'rest', position: 0 });
    expect(peer.machine.motion.tableAt(peer.us)).toBe(0);
  });

  test('a slip moves the table and not the count, until the next pass of the edge tells', () => {
    const peer = new MachinePeer().greet();
    peer.ask(peer.move(500));
    peer.passRenewing(6_000);
    peer.machine.motion.slip(30, peer.us);
    expect(peer.status().position).toBe(500);
    expect(peer.machine.motion.tableAt(peer.us)).toBe(530);
    peer.ask(peer.move(-500));
    peer.passRenewing(6_000);
    expect(edges(peer)).toEqual(['edge -31 cw']);
    expect(peer.status().position).toBe(-500);
  });

  test('a slip over the edge is a pass of it', () => {
    const peer = new MachinePeer().greet();
    peer.machine.motion.slip(-3, peer.us);
    peer.machine.motion.slip(4, peer.us);
    expect(edges(peer)).toEqual(['edge 0 cw', 'edge 0 ccw']);
  });
});

describe('the ring of events (SPEC 7)', () => {
  test('keeps the last 32 and sends eight of them again at a time', () => {
    const peer = new MachinePeer().greet();
    for (let turn = 0; turn < 50; turn += 1) peer.machine.setInput('key', turn % 2 === 1, peer.us);
    // Event 1 is the start; 51 events in all, 20 to 51 are kept.
    expect(peer.ask({ word: 'events', from: 19 }).body).toMatchObject({ word: 'no', code: 'gone', detail: 20 });
    expect(peer.ask({ word: 'events', from: 52 }).body).toMatchObject({ word: 'no', code: 'gone' });
    const again = peer.put(peer.text({ word: 'events', from: 20 }));
    expect(again.slice(1).map((line) => line.split(' ')[1])).toEqual(['20', '21', '22', '23', '24', '25', '26', '27']);
    expect(again[0]).toContain(' ok ');
    expect(peer.put(peer.text({ word: 'events', from: 50 }))).toHaveLength(3);
  });

  test('a repetition of the request sends its stored reply only', () => {
    const peer = new MachinePeer().greet();
    peer.machine.setInput('key', false, peer.us);
    const request = peer.text({ word: 'events', from: 2 });
    expect(peer.put(request)).toHaveLength(2);
    expect(peer.put(request)).toHaveLength(1);
  });
});
