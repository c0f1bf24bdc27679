import type { ChainedEvent } from '@/shared/archive/run-records';
import { linkAge } from '@/components/runs/link-age';
import { liveReducer, mergeRows, noLive, serverOffsetMs, type LiveMessage, type LiveState } from '@/components/runs/live-reducer';
import { readMessage } from '@/components/runs/live-stream';
import { beatAt, nowUtcMs, rowsAt, viewAt } from '../fixtures/run';

const receive = (state: LiveState, ...messages: LiveMessage[]) => liveReducer(state, { kind: 'messages', messages });
const event = (seq: number): LiveMessage => ({
  type: 'event',
  receivedAtMs: 0,
  data: { seq, at: new Date(nowUtcMs).toISOString(), kind: 'mark', data: {}, prev: '', hash: '' } satisfies ChainedEvent,
});
const snapshot = (change: Parameters<typeof viewAt>[1] = {}): LiveMessage => ({
  type: 'snapshot',
  receivedAtMs: 0,
  data: viewAt(nowUtcMs, change),
});

describe('what arrives', () => {
  test('a snapshot carries the whole view, and an older one does not turn the screen back', () => {
    const state = receive(noLive, snapshot({ lastSeq: 40 }), snapshot({ lastSeq: 39, state: 'held' }));
    expect(state.view?.state).toBe('running');
    expect(state.seenSeq).toBe(40);
  });

  test('progress moves what changes and keeps the rest; what was overtaken changes nothing', () => {
    const {
      state,
      startedAt,
      endedAt,
      predictedEndAt,
      deadlineAt,
      dwellsDone,
      dwellsPlanned,
      holdAfterDwell,
      position,
      intervention,
      mayResume,
      maySkip,
      dwellsGood,
      waiting,
      reversal,
      finishing,
      quarantine,
    } = viewAt(nowUtcMs);
    const same = {
      startedAt,
      endedAt,
      predictedEndAt,
      deadlineAt,
      dwellsDone,
      dwellsPlanned,
      holdAfterDwell,
      position,
      intervention,
      mayResume,
      maySkip,
      dwellsGood,
      waiting,
      reversal,
      finishing,
      quarantine,
    };
    const [, row] = rowsAt(nowUtcMs);
    const progress = (lastSeq: number, change: Partial<{ state: 'held'; reason: string }>): LiveMessage => ({
      type: 'progress',
      receivedAtMs: 0,
      data: { ...same, state, reason: '', current: row ?? null, lastSeq, ...change },
    });
    const first = receive(noLive, snapshot({ lastSeq: 40 }));
    const held = receive(first, progress(42, { state: 'held', reason: 'The door is open.' }), progress(41, { reason: 'late' }));
    expect(held.view).toEqual({ ...first.view, state: 'held', reason: 'The door is open.', current: row, lastSeq: 42 });
    expect(held.rows).toContainEqual(row);
    expect(held.seenSeq).toBe(42);
  });

  test('a hole in the chain asks for the whole; loading it clears that', () => {
    const holed = receive(noLive, snapshot({ lastSeq: 10 }), event(11), event(14));
    expect(holed.missed).toBe(true);
    const mended = liveReducer(holed, { kind: 'loaded', view: viewAt(nowUtcMs, { lastSeq: 15 }), rows: rowsAt(nowUtcMs) });
    expect(mended.missed).toBe(false);
    expect(mended.rows).toHaveLength(rowsAt(nowUtcMs).length);
  });

  test('an event that comes twice counts once', () => {
    expect(receive(noLive, event(3), event(3), event(4)).events.map(({ seq }) => seq)).toEqual([3, 4]);
  });

  test('a row that has ended is not opened again by a message that was overtaken', () => {
    const rows = rowsAt(nowUtcMs);
    const last = rows.at(-1);
    if (!last) throw new Error('the fixture has rows');
    const ended = { ...last, endUtcMs: nowUtcMs, outcome: 'done' as const };
    expect(mergeRows([ended], [last])).toEqual([ended]);
    expect(mergeRows(rows.slice(2), rows.slice(0, 3)).map(({ seq }) => seq)).toEqual(rows.map(({ seq }) => seq));
  });

  test('samples sent again after a reconnect are not drawn twice; of two channels the registered one is followed', () => {
    const samples = (channel: string, utcMs: number[]): LiveMessage => ({
      type: 'samples',
      receivedAtMs: 0,
      data: { channelId: `id of ${channel}`, channel, unit: 'rad', utcMs, value: utcMs.map(() => 0.5) },
    });
    const state = receive(noLive, snapshot({ lastSeq: 4 }), samples('spot', [1, 2, 3]), samples('spot', [2, 3, 4]));
    expect(state.utcMs).toEqual([1, 2, 3, 4]);
    expect(receive(state, samples('second camera', [9])).utcMs).toEqual([1, 2, 3, 4]);
    const registered = receive(state, samples('deflection', [9]));
    expect(registered.utcMs).toEqual([9]);
    expect(receive(registered, samples('spot', [10])).utcMs).toEqual([9]);
  });

  test('a long night is thinned at its old end only', () => {
    const utcMs = Array.from({ length: 20_000 }, (_, index) => index);
    const state = receive(noLive, {
      type: 'samples',
      receivedAtMs: 0,
      data: { channelId: 'a', channel: 'deflection', unit: 'rad', utcMs, value: utcMs },
    });
    expect(state.utcMs).toHaveLength(15_000);
    expect(state.utcMs.slice(-3)).toEqual([19_997, 19_998, 19_999]);
    expect(state.utcMs.slice(0, 3)).toEqual([0, 2, 4]);
  });

  test('what is not a message of ours is passed over', () => {
    expect(readMessage('beat', '{"serverAt": 5}', 0)).toBeNull();
    expect(readMessage('beat', 'not json', 0)).toBeNull();
    expect(readMessage('beat', JSON.stringify(beatAt(nowUtcMs)), 7)?.receivedAtMs).toBe(7);
  });
});

test('the offset to the server comes from the quickest beat', () => {
  const beats = [300, 20, 150].map((delayMs): LiveMessage => ({
    type: 'beat',
    receivedAtMs: nowUtcMs - 5000 + delayMs,
    data: beatAt(nowUtcMs),
  }));
  expect(serverOffsetMs(receive(noLive, ...beats))).toBeCloseTo(4980, 0);
});

test('a server whose clock is set while the run goes on moves no countdown: the run keeps to its own time', () => {
  const beat = (serverMs: number, runAheadMs?: number): LiveMessage => {
    const data = { ...beatAt(serverMs), ...(runAheadMs === undefined ? {} : { runAheadMs }) };
    return { type: 'beat', receivedAtMs: nowUtcMs, data };
  };
  const before = receive(noLive, beat(nowUtcMs + 5_000));
  for (const byMs of [-3_600_000, 3_600_000])
    expect(serverOffsetMs(receive(before, beat(nowUtcMs + 5_000 + byMs, -byMs)))).toBeCloseTo(serverOffsetMs(before), 6);
});

describe('how old the newest word is', () => {
  const heard = { heardAtMs: 10_000, beat: beatAt(nowUtcMs), hasController: true };

  test.each([
    [10_500, 'live', null],
    [13_000, 'stale', 'page'],
    [15_500, 'lost', 'page'],
  ] as const)('%d ms: %s', (nowMs, grade, silent) => {
    expect(linkAge({ ...heard, nowMs })).toMatchObject({ grade, silent });
  });

  test('a controller that is silent shows although the server speaks', () => {
    const beat = beatAt(nowUtcMs, { lastReplyAt: new Date(nowUtcMs - 12_000).toISOString() });
    expect(linkAge({ ...heard, beat, nowMs: 10_100 })).toEqual({ grade: 'lost', ageS: 12.1, silent: 'rig' });
    expect(linkAge({ ...heard, beat: beatAt(nowUtcMs, { link: 'lost' }), nowMs: 10_100 })).toMatchObject({ grade: 'lost', silent: 'rig' });
  });

  test('a rehearsal has no controller that could be silent', () => {
    expect(
      linkAge({ ...heard, beat: beatAt(nowUtcMs, { link: 'closed', lastReplyAt: null }), hasController: false, nowMs: 10_100 }),
    ).toMatchObject({ grade: 'live', silent: null });
  });
});

test('a single beat that is an hour ahead, made while the clock of the server was being set, does not count', () => {
  const at = (aheadMs: number): LiveMessage => ({ type: 'beat', data: beatAt(nowUtcMs + aheadMs), receivedAtMs: nowUtcMs });
  expect(serverOffsetMs(receive(noLive, at(40), at(60), at(3_600_000), at(-9_000)))).toBeCloseTo(60, 0);
  expect(serverOffsetMs(receive(noLive, at(40), at(3_600_000)))).toBeCloseTo(40, 0);
});
