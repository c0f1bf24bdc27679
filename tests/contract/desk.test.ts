import { pino } from 'pino';
import * as z from 'zod';
import { defineRoute } from '@/shared/contracts/route';
import { VirtualClock } from '@/server/engine/virtual-clock';
import { AcrossDesk } from '@/server/http/desk/across-desk';
import { DeskClerk } from '@/server/http/desk/desk-clerk';
import { HereDesk } from '@/server/http/desk/here-desk';
import type { AskedOfRig, RigDesk, WhichRig } from '@/server/http/desk/rig-desk';
import { problemErrorOf } from '@/server/http/errors';
import { ProblemError } from '@/server/http/problem-error';
import { mount, type MountedRoute } from '@/server/http/route-context';
import type { Services } from '@/server/http/services';
import { PostOffice, type OfficePost } from '@/tests/support/post-office';

/** What the routes may expect of a desk, whether the rig is driven in this process or in another. */

const turn = defineRoute({
  ...{ name: 'turn', summary: '', method: 'POST', path: '/labs/:labId/rigs/:rigId/turn', access: 'run.start', status: 202, problems: [] },
  query: z.strictObject({ slowly: z.enum(['true']).optional() }),
  body: z.strictObject({ byDeg: z.number(), note: z.string().default('none') }),
  response: z.strictObject({ heard: z.unknown() }),
});
const list = defineRoute({
  ...{ name: 'list', summary: '', method: 'GET', path: '/labs/:labId/rigs', access: 'read', status: 200, problems: [] },
  response: z.strictObject({ items: z.array(z.strictObject({ id: z.string(), by: z.string() })) }),
});

const me = { userId: 'u', name: 'Ilse Marrowby', email: 'ilse@quillfen.example' };
const membership = { labId: 'lab', labName: 'Quillfen', timeZone: 'UTC', role: 'operator' as const };
const rigs = ['north', 'south'];

/** A process whose route tells what it was asked, and does what `deed` says. */
class Rigs {
  readonly done: unknown[] = [];
  deed: (body: { byDeg: number }) => Promise<unknown> | unknown = () => undefined;

  constructor(readonly name: string) {}

  desk(): HereDesk {
    const services = { config: { mode: 'test' }, log: pino({ level: 'silent' }) } as unknown as Services;
    const routes: MountedRoute[] = [
      mount(turn, async (context) => {
        const { params, query, body, ifMatch } = context;
        this.done.push(body);
        await this.deed(body);
        context.setEtag('seven');
        return { heard: { params, query, body, ifMatch, by: context.me.name, lab: context.membership.labId } };
      }),
      mount(list, () => ({ items: rigs.map((id) => ({ id, by: this.name })) })),
    ];
    return new HereDesk(routes, () => services);
  }
}

const flush = async () => {
  for (let turns = 0; turns < 10; turns += 1) await new Promise<void>((resolve) => void setImmediate(resolve));
};

interface Bench {
  clock: VirtualClock;
  desk: RigDesk;
  rig: Rigs;
}

class AcrossBench implements Bench {
  readonly clock = new VirtualClock(0, flush);
  readonly office = new PostOffice();
  readonly rig = new Rigs('the process of the rigs');
  readonly stored = new Rigs('the database');
  readonly recalled: string[] = [];
  readonly desk: AcrossDesk;
  readonly post: OfficePost;
  readonly web: OfficePost;
  readonly errors: unknown[] = [];
  private ids = 0;

  constructor() {
    this.web = this.office.process('web');
    this.desk = new AcrossDesk({
      ...{ post: this.web, clock: this.clock, here: this.stored.desk(), newId: () => `question ${String((this.ids += 1))}` },
      recall: async (_, isMeant) => void this.recalled.push(...rigs.filter(isMeant)),
    });
    this.post = this.drive(this.rig, ['north']);
  }

  drive(rig: Rigs, own: readonly string[]): OfficePost {
    const post = this.office.process(rig.name);
    for (const id of own) this.office.drivers.set(id, rig.name);
    new DeskClerk({
      ...{ post, here: rig.desk(), drives: (rigId) => own.includes(rigId), databaseAwaySinceUtcMs: () => null },
      onError: (error) => void this.errors.push(error),
      background: () => undefined,
    });
    return post;
  }
}

function hereBench(): Bench {
  const rig = new Rigs('the process of the rigs');
  return { clock: new VirtualClock(0, flush), desk: rig.desk(), rig };
}

function turning(byDeg: unknown, how: Partial<Omit<AskedOfRig, 'which'>> & { which?: WhichRig } = {}): AskedOfRig {
  const { which = { labId: 'lab', rigId: 'north' }, ...rest } = how;
  const question = { route: 'turn', params: { labId: 'lab', rigId: 'north' }, query: {}, body: { byDeg }, ifMatch: '3' };
  return { question: { ...question, me, membership }, which: async () => which, urgent: false, elseStored: false, ...rest };
}

/** JSON, or what a desk threw. */
type Loose = ReturnType<JSON['parse']>;

/** What became of a question while `ms` pass. */
async function after(bench: Bench, ms: number, asking: Promise<unknown>): Promise<Loose> {
  const outcome = asking.catch((error: unknown) => error);
  await bench.clock.advance(ms);
  return Promise.race([outcome, flush().then(() => 'no answer yet')]);
}

describe.each([
  ['in this process', hereBench],
  ['across processes', () => new AcrossBench()],
])('a desk %s', (_, made) => {
  test.each([false, true])('brings the request to the route and its answer back (urgent: %s)', async (urgent) => {
    const bench = made();
    const asked = turning(2.5, { urgent });
    const answer = await after(bench, 10, bench.desk.ask({ ...asked, question: { ...asked.question, query: { slowly: 'true' } } }));
    const params = { labId: 'lab', rigId: 'north' };
    const heard = { params, query: { slowly: 'true' }, body: { byDeg: 2.5, note: 'none' }, ifMatch: '3', by: 'Ilse Marrowby', lab: 'lab' };
    expect(answer).toEqual({ status: 202, body: { heard }, etag: 'seven' });
  });

  test('brings a refusal back whole', async () => {
    const bench = made();
    bench.rig.deed = () => {
      throw new ProblemError('locked', 'Vesna has hands in the rig.', [
        { path: 'lock', message: 'lifted at the rig', code: 'hands' },
      ]).after(3);
    };
    const refusal = (await after(bench, 10, bench.desk.ask(turning(1)))) as ProblemError;
    expect(refusal).toBeInstanceOf(ProblemError);
    expect(refusal).toMatchObject({ code: 'locked', detail: 'Vesna has hands in the rig.', retryAfterS: 3 });
    expect(refusal.errors).toEqual([{ path: 'lock', message: 'lifted at the rig', code: 'hands' }]);
  });

  test('refuses a body that does not fit', async () => {
    const bench = made();
    expect(await after(bench, 10, bench.desk.ask(turning('much')))).toMatchObject({ code: 'invalid-input', errors: [{ path: 'byDeg' }] });
    expect(bench.rig.done).toEqual([]);
  });

  test('tells nothing of the inside where something unforeseen happens', async () => {
    const bench = made();
    bench.rig.deed = () => {
      throw new Error('row 7 of the table of secrets');
    };
    const problem = problemErrorOf(await after(bench, 10, bench.desk.ask(turning(1))));
    expect(problem.code).toBe('internal');
    expect(problem.detail).not.toContain('secrets');
  });

  test('brings questions in the order in which they were asked', async () => {
    const bench = made();
    await Promise.all([after(bench, 10, bench.desk.ask(turning(1))), bench.desk.ask(turning(2)), bench.desk.ask(turning(3))]);
    expect(bench.rig.done).toMatchObject([{ byDeg: 1 }, { byDeg: 2 }, { byDeg: 3 }]);
  });

  test('waits for an answer that takes its time', async () => {
    const bench = made();
    bench.rig.deed = () => new Promise<void>((resolve) => void bench.clock.after(5_000, resolve));
    const asking = bench.desk.ask(turning(1));
    expect(await after(bench, 4_900, asking)).toBe('no answer yet');
    expect(await after(bench, 200, asking)).toMatchObject({ status: 202 });
  });

  test('asks for a list of rigs', async () => {
    const bench = made();
    const question = { ...turning(0).question, route: 'list', body: undefined };
    const { body } = await after(bench, 10, bench.desk.askEach(question, 'lab'));
    expect(body.items.map(({ id }: { id: string }) => id)).toEqual(rigs);
    expect(body.items[0].by).toBe('the process of the rigs');
  });
});

describe('across processes', () => {
  test('what nobody takes within 2 s never happens, and the problem says so', async () => {
    const bench = new AcrossBench();
    bench.post.deaf = true;
    const asking = bench.desk.ask(turning(1));
    expect(await after(bench, 1_990, asking)).toBe('no answer yet');
    const problem = (await after(bench, 20, asking)) as ProblemError;
    expect(problem.code).toBe('rigs-away');
    expect(problem.detail).toContain('Nothing was set in motion.');
    expect(problem.detail).toContain('starts a process with the role rig');
    bench.post.hearAgain();
    await bench.web.tell({ kind: 'question', labId: 'lab', id: 'question 1', to: { rigId: 'north' } });
    await bench.clock.advance(1_000);
    expect(bench.rig.done).toEqual([]);
  });

  test('what was taken by a process that then died may have been done', async () => {
    const bench = new AcrossBench();
    bench.rig.deed = () => new Promise(() => undefined);
    const asking = bench.desk.ask(turning(1));
    expect(await after(bench, 14_900, asking)).toBe('no answer yet');
    expect(((await after(bench, 200, asking)) as ProblemError).detail).toContain('may have been done all the same');
  });

  test('an answer that was not heard is found', async () => {
    const bench = new AcrossBench();
    bench.web.deaf = true;
    expect(await after(bench, 2_010, bench.desk.ask(turning(1)))).toMatchObject({ status: 202 });
    expect(bench.rig.done).toHaveLength(1);
  });

  test('an urgent question is said again until it is heard, and acted upon once', async () => {
    const bench = new AcrossBench();
    bench.post.deaf = true;
    const asking = bench.desk.ask(turning(1, { urgent: true }));
    await bench.clock.advance(500);
    bench.post.deaf = false;
    bench.web.deaf = true;
    await bench.clock.advance(500);
    expect(bench.rig.done).toHaveLength(1);
    bench.web.deaf = false;
    expect(await after(bench, 500, asking)).toMatchObject({ status: 202 });
    expect(bench.rig.done).toHaveLength(1);
    expect(bench.office.laid.size).toBe(0);
  });

  test('of two processes the one acts that drives the rig; what any may do is done once', async () => {
    const bench = new AcrossBench();
    const other = new Rigs('another process');
    bench.drive(other, ['south']);
    await after(bench, 10, bench.desk.ask(turning(1, { which: { labId: 'lab', rigId: 'south' } })));
    expect([bench.rig.done.length, other.done.length]).toEqual([0, 1]);
    await after(bench, 10, bench.desk.ask(turning(2, { which: 'any' })));
    expect(bench.rig.done.length + other.done.length).toBe(2);
    const question = { ...turning(0).question, route: 'list', body: undefined };
    const { body } = await after(bench, 10, bench.desk.askEach(question, 'lab'));
    expect(body.items).toEqual([
      { id: 'north', by: 'the process of the rigs' },
      { id: 'south', by: 'another process' },
    ]);
  });

  test('what only reads is told out of the database where nobody drives the rig or answers', async () => {
    const bench = new AcrossBench();
    const asked = { urgent: true, elseStored: true };
    await after(bench, 10, bench.desk.ask(turning(1, { ...asked, which: { labId: 'lab', rigId: 'south' } })));
    expect([bench.rig.done.length, bench.stored.done.length, bench.recalled]).toEqual([0, 1, ['south']]);
    bench.post.deaf = true;
    expect(await after(bench, 2_010, bench.desk.ask(turning(1, asked)))).toMatchObject({ status: 202 });
    expect([bench.stored.done.length, bench.recalled]).toEqual([2, ['south', 'north']]);
    const question = { ...turning(0).question, route: 'list', body: undefined };
    const { body } = await after(bench, 2_010, bench.desk.askEach(question, 'lab'));
    expect(body.items.map(({ by }: { by: string }) => by)).toEqual(['the database', 'the database']);
  });

  test('what needs no rig is answered by whoever was asked', async () => {
    const bench = new AcrossBench();
    await after(bench, 10, bench.desk.ask(turning(1, { which: null })));
    expect([bench.rig.done.length, bench.stored.done.length]).toEqual([0, 1]);
  });

  test('without the database the problem names it and the switch at the rig', async () => {
    const bench = new AcrossBench();
    bench.web.tell = () => Promise.reject(Object.assign(new Error('gone'), { code: 'ECONNRESET' }));
    const problem = (await after(bench, 10, bench.desk.ask(turning(1, { urgent: true })))) as ProblemError;
    expect(problem).toMatchObject({ code: 'rigs-away' });
    expect(problem.detail).toMatch(/database.*does not answer.*switch at the rig/);
  });
});
