import { createHash } from 'node:crypto';
import { appendEvent, canonicalJson, emptyChain, verifyChain, type ChainHead } from '@/shared/archive/chain';
import type { ChainedEvent } from '@/shared/archive/run-records';

const sha256 = (text: string) => createHash('sha256').update(text, 'utf8').digest('hex');

function chainOf(length: number): ChainedEvent[] {
  const events: ChainedEvent[] = [];
  let head: ChainHead = emptyChain;
  for (let k = 0; k < length; k += 1) {
    const event = appendEvent(head, { at: `2026-01-01T00:00:0${k}.000Z`, kind: 'mark', data: { note: `n${k}`, angle: -0.5 * k } }, sha256);
    events.push(event);
    head = event;
  }
  return events;
}

describe('the event chain', () => {
  test('starts at seq 1 after 64 zeros, and each event carries the hash of the one before', () => {
    const events = chainOf(3);
    expect(events.map((event) => event.seq)).toEqual([1, 2, 3]);
    expect(events[0]?.prev).toBe('0'.repeat(64));
    expect(events[2]?.prev).toBe(events[1]?.hash);
    expect(verifyChain(events, sha256)).toEqual({
      valid: true,
      events: 3,
      head: expect.objectContaining({ seq: 3, hash: events[2]?.hash }) as unknown,
    });
  });

  test('hashes the canonical JSON of the event without its hash', () => {
    const event = appendEvent(emptyChain, { at: '2026-01-01T00:00:00.000Z', kind: 'mark', data: { b: 1, a: 'ö' } }, sha256);
    const byHand = `{"at":"2026-01-01T00:00:00.000Z","data":{"a":"ö","b":1},"kind":"mark","prev":"${'0'.repeat(64)}","seq":1}`;
    expect(event.hash).toBe(sha256(byHand));
  });

  test('stays valid when the keys of an event are written in another order', () => {
    const events = chainOf(2).map(({ seq, at, kind, data, prev, hash }) => ({ hash, prev, data, kind, at, seq }));
    expect(verifyChain(events, sha256).valid).toBe(true);
  });

  test.each([
    {
      what: 'changed data',
      change: (events: ChainedEvent[]) => Object.assign(events[1] as ChainedEvent, { data: { note: 'other' } }),
      seq: 2,
    },
    {
      what: 'a changed time',
      change: (events: ChainedEvent[]) => Object.assign(events[2] as ChainedEvent, { at: '2026-01-02T00:00:00.000Z' }),
      seq: 3,
    },
    { what: 'an event taken out', change: (events: ChainedEvent[]) => events.splice(1, 1), seq: 2 },
    { what: 'a first event taken out', change: (events: ChainedEvent[]) => events.shift(), seq: 1 },
    {
      what: 'two events swapped',
      change: (events: ChainedEvent[]) => events.splice(1, 2, events[2] as ChainedEvent, events[1] as ChainedEvent),
      seq: 2,
    },
  ])('names the event with $what', ({ change, seq }) => {
    const events = chainOf(4);
    change(events);
    expect(verifyChain(events, sha256)).toMatchObject({ valid: false, seq });
  });

  test('an event rewritten with a fresh hash breaks the next one', () => {
    const events = chainOf(4);
    events[1] = appendEvent(events[0] as ChainedEvent, { at: '2026-01-01T00:00:01.000Z', kind: 'mark', data: { note: 'forged' } }, sha256);
    expect(verifyChain(events, sha256)).toMatchObject({ valid: false, seq: 3 });
  });
});

describe('canonical JSON', () => {
  // RFC 8785, section 3.2.2 and 3.2.3: sample object and its canonical form.
  test('of the sample of RFC 8785 is as printed there', () => {
    const sample = {
      numbers: [333333333.33333329, 1e30, 4.5, 2e-3, 0.000000000000000000000000001],
      string: '\u20ac$\u000F\u000aA\'\u0042\u0022\u005c\\"\/',
      literals: [null, true, false],
    };
    expect(canonicalJson(sample)).toBe(
      '{"literals":[null,true,false],"numbers":[333333333.3333333,1e+30,4.5,0.002,1e-27],"string":"€$\\u000f\\nA\'B\\"\\\\\\\\\\"/"}',
    );
  });

  test('of something that is not JSON is refused', () => {
    expect(() => canonicalJson({ angle: NaN })).toThrow();
    expect(() => canonicalJson(undefined)).toThrow();
  });
});
