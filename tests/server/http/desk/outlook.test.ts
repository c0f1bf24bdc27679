import { VirtualClock } from '@/server/engine/virtual-clock';
import { AcrossOutlook } from '@/server/http/desk/across-outlook';
import type { RigDesk } from '@/server/http/desk/rig-desk';
import { HereOutlook, type RigOutlook } from '@/server/http/desk/rig-outlook';
import { RigTeller } from '@/server/http/desk/rig-teller';
import type { Services } from '@/server/http/services';
import type { RigTold } from '@/server/interfaces/process-post';
import { PostOffice } from '@/tests/support/post-office';

/** What pages of one process are told of a rig that another one drives. */

const flush = async () => {
  for (let turns = 0; turns < 10; turns += 1) await new Promise<void>((resolve) => void setImmediate(resolve));
};
const place = { labId: 'lab', rigId: 'north' };

function bench() {
  const clock = new VirtualClock(0, flush);
  const office = new PostOffice();
  const [web, rig] = [office.process('web'), office.process('rig')];
  const now = { angleDeg: 12 };
  const source = {
    line: () => ({ beat: clock.monotonicMs() }),
    beat: (): RigTold['beat'] => ({ link: 'ready', lastReplyAt: '2031-01-14T20:00:00.000Z', angleDeg: now.angleDeg, lockedBy: null }),
  } as unknown as RigOutlook;
  const teller = new RigTeller({ post: rig, clock, outlook: source, drives: (rigId) => rigId === 'north', onError: () => undefined });
  const outlook = new AcrossOutlook({ post: web, clock, desk: {} as RigDesk });
  return { clock, office, rig, web, now, teller, outlook };
}

async function followed(made: ReturnType<typeof bench>): Promise<void> {
  const following = made.outlook.follow(place);
  await made.clock.advance(10);
  await following;
}

test('a page that begins to follow a rig knows it at once, and each change at once', async () => {
  const made = bench();
  await followed(made);
  expect(made.outlook.beat(place)).toMatchObject({ link: 'ready', angleDeg: 12 });
  expect(made.outlook.line(place)).toEqual({ beat: 0 });
  made.now.angleDeg = 13;
  made.teller.rigChanged('north');
  await flush();
  expect(made.outlook.beat(place).angleDeg).toBe(13);
});

test('it is told twice a second as long as somebody looks, and no more when nobody does', async () => {
  const made = bench();
  await followed(made);
  const told = () => made.office.said.filter(({ kind }) => kind === 'rig').length;
  for (let second = 0; second < 20; second += 1) {
    await made.clock.advance(1_000);
    made.outlook.beat(place);
    expect(made.outlook.line(place)).toMatchObject({ beat: 1000 * (second + 1) });
  }
  expect(told()).toBe(41);
  await made.clock.advance(30_000);
  const before = told();
  await made.clock.advance(30_000);
  expect(told()).toBe(before);
});

test('where the other process falls silent the page is told so within 2 s, with the last reply, and hears it again later', async () => {
  const made = bench();
  await followed(made);
  made.web.deaf = true;
  await made.clock.advance(2_500);
  expect(made.outlook.beat(place)).toEqual({
    ...{ link: 'lost', lastReplyAt: '2031-01-14T20:00:00.000Z', angleDeg: null, lockedBy: null },
    notDriven: expect.stringContaining('No process drives this rig'),
  });
  expect(made.outlook.line(place)).toBeNull();
  made.web.deaf = false;
  await made.clock.advance(1_000);
  expect(made.outlook.beat(place)).toMatchObject({ link: 'ready' });
  expect(made.outlook.beat(place).notDriven).toBeUndefined();
});

test('nobody tells of the rig: following it is refused after 2 s', async () => {
  const made = bench();
  made.rig.deaf = true;
  const following = made.outlook.follow(place).catch((error: unknown) => error);
  await made.clock.advance(2_010);
  expect(await following).toMatchObject({ code: 'rigs-away' });
});

test('samples of a simulated rig go out with its beat while it is followed; those of a device at once, for whoever drives the rig', async () => {
  const made = bench();
  const channel = { channelId: 'c', name: 'deflection', unit: 'rad', role: 'deflection' as const, rateHz: 10 };
  const batch = { rigId: 'north', channel, utcMs: Float64Array.of(1, 2), value: Float64Array.of(3, 4) };
  const samples = () => made.office.said.filter(({ kind }) => kind === 'samples');
  made.teller.sampled(batch);
  await made.clock.advance(1_000);
  expect(samples()).toEqual([]);
  made.teller.fromDevice(batch);
  expect(samples()).toEqual([{ kind: 'samples', rigId: 'north', channel, utcMs: [1, 2], value: [3, 4] }]);
  await followed(made);
  made.teller.sampled(batch);
  await made.clock.advance(600);
  expect(samples()).toHaveLength(2);
});

test('a beat says how far the time of a run is from that of the server, where its clock was set meanwhile', () => {
  const clock = { utcMs: () => 10_000, wallUtcMs: () => 3_610_000 };
  const driven = { activeOf: () => ({ parts: { clock } }) };
  const beatOf = (supervisor: object) =>
    new HereOutlook(() => ({ stations: { get: () => null }, locks: { lockedBy: () => null }, supervisor }) as unknown as Services).beat(
      place,
    );
  expect(beatOf(driven)).toEqual({ runAheadMs: -3_600_000, link: 'closed', lastReplyAt: null, angleDeg: null, lockedBy: null });
  expect(beatOf({ activeOf: () => null })).not.toHaveProperty('runAheadMs');
});
