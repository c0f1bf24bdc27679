import ICAL from 'ical.js';
import request from 'supertest';
import { demoIds } from '@/db/demo/seed';
import { heedSchedules } from '@/server/http/work/scheduled-starts';
import type { Mail } from '@/server/interfaces/mail';
import { databaseOfThisFile } from '@/tests/support/database';
import { LabServer, quickProtocol } from '@/tests/support/lab-server';

const database = databaseOfThisFile();
const mails: Mail[] = [];
let lab: LabServer;
let protocolId: string;
beforeAll(async () => {
  lab = await LabServer.start(database(), { overrides: { mail: { send: async (mail) => void mails.push(mail) } } });
  protocolId = await lab.issue(quickProtocol());
}, 60_000);
afterAll(() => lab.stop());

const base = `/labs/${demoIds.lab}`;
const minute = 60_000;
const hour = 3_600_000;
const iso = (utcMs: number) => new Date(utcMs).toISOString();
const ask = (plan: object, change: object = {}) =>
  lab
    .as('operator', 'POST', `${base}/schedules`)
    .send({ rigId: demoIds.rig, protocolId, revision: 1, massSetId: demoIds.massSet, plan, ...change });
const calendar = async (days = 60) => {
  const [from, until] = [lab.clock.utcMs() - 2 * 24 * hour, lab.clock.utcMs() + days * 24 * hour].map(iso);
  const { body } = await lab.as('viewer', 'GET', `${base}/calendar?from=${String(from)}&until=${String(until)}`).expect(200);
  return body.items as { scheduleId: string; dueAt: string; endsAt: string; state: string; why: string; runId: string | null }[];
};
const end = (id: string) => lab.as('operator', 'PATCH', `${base}/schedules/${id}`).send({ state: 'ended' }).expect(200);
/** What the server does each minute. */
const heed = async () => {
  await heedSchedules(lab.services);
  await lab.advance(31_000);
};

/** The lab stands in Zurich, and it is 14 February 2031, 21:00 there (UTC+1): the world of the tests begins on a winter's evening. */
test('starts a run at its time, once, in the name of whoever made it, and ends after its last start', async () => {
  const made = await ask({ kind: 'once', date: '2031-02-14', time: '21:05' }, { notes: 'first night' }).expect(201);
  expect(made.body).toMatchObject({ rigName: 'North bench', protocolName: 'There and back', state: 'active', madeBy: 'Ilse Marrowby' });
  expect(await calendar()).toMatchObject([{ dueAt: '2031-02-14T20:05:00.000Z', state: 'planned', why: '' }]);
  await lab.arm();
  await heed();
  expect(await calendar()).toMatchObject([{ state: 'planned' }]);
  await lab.advance(Date.parse('2031-02-14T20:05:10Z') - lab.clock.utcMs());
  await heed();
  await heed();
  const [item] = await calendar();
  expect(item).toMatchObject({ state: 'started', why: '' });
  const { body: run } = await lab.as('viewer', 'GET', `${base}/runs/${item?.runId ?? ''}`).expect(200);
  expect(run).toMatchObject({ operator: 'Ilse Marrowby', notes: 'first night', protocolName: 'There and back' });
  const { body: runs } = await lab.as('viewer', 'GET', `${base}/runs?active=true`).expect(200);
  expect(runs.items).toHaveLength(1);
  expect((await lab.as('viewer', 'GET', `${base}/schedules`).expect(200)).body.items).toEqual([]);
  await lab.until(run.id as string, 'finished');
  await lab.advance(5_000, () => mails.length > 1);
  expect(mails.map(({ subject }) => subject.split(':')[0])).toEqual(['Started', 'Finished']);
  mails.length = 0;
});

test('never arms: two hours before, whoever made it is told that the arm is missing, once; at its time the start is missed', async () => {
  await lab.as('operator', 'DELETE', `${base}/rigs/${demoIds.rig}/arm`).expect(204);
  const local = (utcMs: number) => new Date(utcMs + hour).toISOString();
  const due = Math.ceil(lab.clock.utcMs() / minute) * minute + 122 * minute;
  const made = await ask({ kind: 'once', date: local(due).slice(0, 10), time: local(due).slice(11, 16) }).expect(201);
  await heed();
  expect(mails).toEqual([]);
  await lab.advance(3 * minute);
  await heed();
  await heed();
  expect(mails).toMatchObject([
    {
      to: 'ilse@quillfen.example',
      subject: 'Not armed yet: North bench, There and back',
      text: expect.stringContaining(`${local(due).slice(0, 10)} ${local(due).slice(11, 16)}`),
    },
  ]);
  await end(made.body.id as string);

  const soon = Math.ceil(lab.clock.utcMs() / minute) * minute + minute;
  await ask({ kind: 'once', date: local(soon).slice(0, 10), time: local(soon).slice(11, 16) }).expect(201);
  await lab.advance(soon + 10_000 - lab.clock.utcMs());
  await heed();
  expect((await calendar()).at(-1)).toMatchObject({ dueAt: iso(soon), state: 'missed', runId: null });
  expect((await calendar()).at(-1)?.why).toContain('Armed on site: ');
  expect(mails.at(-1)).toMatchObject({
    subject: 'Not started: There and back on North bench',
    text: expect.stringContaining('Nothing has moved.'),
  });
  expect(mails).toHaveLength(2);
  const alarms = (await lab.as('viewer', 'GET', `${base}/alarms`).expect(200)).body.items as { code: string; rings: string }[];
  expect(alarms).toContainEqual(
    expect.objectContaining({ code: 'missed-start', rings: 'never', words: expect.stringContaining('Armed on site') }),
  );
});

test('recurs at the local time through the change of the clocks; one start is skipped and taken back; paused and continued', async () => {
  const made = await ask({ kind: 'weekly', days: ['sat', 'sun', 'mon'], time: '02:30', from: '2031-03-29', until: null }).expect(201);
  const id = made.body.id as string;
  const ahead = async () => (await calendar(50)).filter(({ scheduleId }) => scheduleId === id);
  expect((await ahead()).slice(0, 3)).toMatchObject([
    { dueAt: '2031-03-29T01:30:00.000Z', remark: null },
    { dueAt: '2031-03-30T01:00:00.000Z', remark: expect.stringContaining('02:30 does not exist') },
    { dueAt: '2031-03-31T00:30:00.000Z', remark: null },
  ]);
  const skip = (dueAt: string, skipped: boolean) => lab.as('operator', 'PUT', `${base}/schedules/${id}/skips`).send({ dueAt, skipped });
  await skip('2031-03-30T01:00:00Z', true).expect(200);
  expect((await ahead())[1]).toMatchObject({ state: 'skipped', why: 'Skipped by Ilse Marrowby.' });
  expect((await skip('2031-03-30T01:00:00Z', true).expect(409)).body.detail).toContain('is skipped already');
  await skip('2031-03-30T01:00:00Z', false).expect(200);
  expect((await ahead())[1]).toMatchObject({ state: 'planned' });
  await skip('2031-03-30T01:30:00Z', true).expect(404);
  await lab.as('operator', 'PATCH', `${base}/schedules/${id}`).send({ state: 'paused' }).expect(200);
  expect((await ahead()).map(({ state }) => state)).toContain('paused');
  await lab.as('operator', 'PATCH', `${base}/schedules/${id}`).send({ state: 'active' }).expect(200);
  await end(id);
  expect(await ahead()).toEqual([]);
  const again = await lab.as('operator', 'PATCH', `${base}/schedules/${id}`).send({ state: 'active' }).expect(409);
  expect(again.body.detail).toBe('The schedule has ended. Make a new one.');
});

test('what cannot be is refused at once, with what would be right', async () => {
  const past = await ask({ kind: 'once', date: '2031-02-01', time: '22:00' }).expect(409);
  expect(past.body.detail).toContain('2031-02-01 22:00 is past');
  const first = await ask({ kind: 'once', date: '2031-03-02', time: '22:00' }).expect(201);
  const second = await ask({ kind: 'once', date: '2031-03-02', time: '22:01' }).expect(409);
  expect(second.body.detail).toMatch(/North bench is taken then: Ilse Marrowby scheduled "There and back" from 2031-03-02 22:00/);
  await end(first.body.id as string);
  await ask({ kind: 'once', date: '2031-03-02', time: '25:00' }).expect(400);
  await ask({ kind: 'weekly', days: [], time: '22:00', from: '2031-03-02', until: null }).expect(400);
  await ask({ kind: 'once', date: '2031-03-02', time: '22:00' }, { revision: 7 }).expect(404);
});

test('whoever starts by hand is told of a start that the run would be in the way of; one skipped or on another day is none', async () => {
  const due = new Date(Math.ceil(lab.clock.utcMs() / minute) * minute + 2 * minute);
  const local = new Date(due.getTime() + hour).toISOString();
  const checks = `${base}/rigs/${demoIds.rig}/start-checks?protocolId=${demoIds.shortProtocol}&revision=1`;
  const told = async () =>
    (await lab.as('operator', 'GET', checks).expect(200)).body.checks.filter(({ code }: { code: string }) => code === 'schedule');
  const { body: later } = await ask({ kind: 'once', date: '2031-02-20', time: '22:00' }).expect(201);
  expect(await told()).toEqual([]);
  const { body: soon } = await ask({ kind: 'once', date: local.slice(0, 10), time: local.slice(11, 16) }).expect(201);
  expect(await told()).toMatchObject([
    {
      state: 'note',
      detail: expect.stringMatching(
        new RegExp(`"There and back" is scheduled here for .*${local.slice(11, 16)}.*that start would be missed`),
      ),
    },
  ]);
  const skips = `${base}/schedules/${String(soon.id)}/skips`;
  await lab.as('operator', 'PUT', skips).send({ dueAt: due.toISOString(), skipped: true }).expect(200);
  expect(await told()).toEqual([]);
  await end(soon.id as string);
  await end(later.id as string);
});

test('night window and blackout dates of the room are honoured', async () => {
  const hours = {
    nightWindow: { from: '21:00', until: '06:30' },
    blackouts: [{ from: '2031-03-05', until: '2031-03-06', why: 'floor is laid' }],
  };
  const path = `${base}/rigs/${demoIds.rig}/hours`;
  expect((await lab.as('viewer', 'GET', path).expect(200)).body).toEqual({ nightWindow: null, blackouts: [] });
  await lab.as('operator', 'PUT', path).send(hours).expect(403);
  await lab.as('keeper', 'PUT', path).send(hours).expect(200);
  const byDay = await ask({ kind: 'once', date: '2031-03-04', time: '12:00' }).expect(409);
  expect(byDay.body.detail).toContain('the night window of the room is 21:00 to 06:30');
  const made = await ask({ kind: 'weekly', days: ['tue', 'wed', 'fri'], time: '22:00', from: '2031-03-04', until: '2031-03-07' }).expect(
    201,
  );
  expect(
    (await calendar())
      .filter(({ scheduleId }) => scheduleId === made.body.id)
      .map(({ dueAt, state, why }) => [dueAt.slice(0, 10), state, why]),
  ).toEqual([
    ['2031-03-04', 'planned', ''],
    ['2031-03-05', 'blocked', '2031-03-05 is a blackout date: floor is laid.'],
    ['2031-03-07', 'planned', ''],
  ]);
});

test('a calendar program reads it at a secret address, and no longer when that is ended', async () => {
  const { body } = await lab.as('viewer', 'POST', `${base}/calendar-feed`).send({}).expect(201);
  const path = new URL(body.address as string).pathname;
  const read = () => request(lab.built.app).get(path);
  const answer = await read()
    .expect(200)
    .expect('Content-Type', /text\/calendar/);
  const events = new ICAL.Component(ICAL.parse(answer.text)).getAllSubcomponents('vevent').map((component) => new ICAL.Event(component));
  const blocked = events.find((event) => event.startDate.toJSDate().toISOString() === '2031-03-05T21:00:00.000Z');
  expect(blocked?.summary).toBe('North bench: There and back, revision 1');
  expect(blocked?.component.getFirstPropertyValue('status')).toBe('CANCELLED');
  expect(blocked?.description).toContain('floor is laid');
  const planned = events.find((event) => event.startDate.toJSDate().toISOString() === '2031-03-04T21:00:00.000Z');
  expect(planned?.component.getFirstPropertyValue('status')).toBe('CONFIRMED');
  // Skipped, then taken back: the number of the revision never falls, or programs would go on showing it crossed out.
  const revisionOf = async () => {
    const all = new ICAL.Component(ICAL.parse((await read().expect(200)).text)).getAllSubcomponents('vevent');
    const one = all.find((component) => component.getFirstPropertyValue('uid') === planned?.uid);
    return { sequence: Number(one?.getFirstPropertyValue('sequence')), status: one?.getFirstPropertyValue('status') };
  };
  const scheduleId = planned?.uid.split('.')[0] ?? '';
  const skip = (skipped: boolean) =>
    lab.as('operator', 'PUT', `${base}/schedules/${scheduleId}/skips`).send({ dueAt: '2031-03-04T21:00:00Z', skipped }).expect(200);
  const before = await revisionOf();
  await lab.advance(2_000);
  await skip(true);
  const skipped = await revisionOf();
  await lab.advance(2_000);
  await skip(false);
  const back = await revisionOf();
  expect([before.status, skipped.status, back.status]).toEqual(['CONFIRMED', 'CANCELLED', 'CONFIRMED']);
  expect(before.sequence).toBeLessThan(skipped.sequence);
  expect(skipped.sequence).toBeLessThan(back.sequence);
  // So do a pause and a blackout, which cross it out too.
  const hours = `${base}/rigs/${demoIds.rig}/hours`;
  const blackouts = [{ from: '2031-03-04', until: '2031-03-06', why: 'floor is laid' }];
  const { body: room } = await lab.as('viewer', 'GET', hours).expect(200);
  const changes = [
    () => lab.as('operator', 'PATCH', `${base}/schedules/${scheduleId}`).send({ state: 'paused' }),
    () => lab.as('operator', 'PATCH', `${base}/schedules/${scheduleId}`).send({ state: 'active' }),
    () => lab.as('keeper', 'PUT', hours).send({ ...room, blackouts }),
    () => lab.as('keeper', 'PUT', hours).send(room),
  ];
  const revisions = [back];
  for (const change of changes) {
    await lab.advance(2_000);
    await change().expect(200);
    revisions.push(await revisionOf());
  }
  expect(revisions.map(({ status }) => status)).toEqual(['CONFIRMED', 'TENTATIVE', 'CONFIRMED', 'CANCELLED', 'CONFIRMED']);
  expect(revisions.map(({ sequence }) => sequence)).toEqual([...new Set(revisions.map(({ sequence }) => sequence))].sort((a, b) => a - b));
  const again = new ICAL.Component(ICAL.parse((await read().expect(200)).text)).getAllSubcomponents('vevent');
  expect(again.map((component) => component.getFirstPropertyValue('uid'))).toEqual(events.map(({ uid }) => uid));
  expect(new Set(events.map(({ uid }) => uid)).size).toBe(events.length);
  await request(lab.built.app).get('/api/calendars/nobody-knows').expect(404);
  await lab.as('viewer', 'DELETE', `${base}/calendar-feed`).expect(204);
  await read().expect(404);
});

test('the door card says when to keep out, until when and whom to ring, to whoever knows its address', async () => {
  const path = `${base}/rigs/${demoIds.rig}/door`;
  expect((await lab.as('viewer', 'GET', path).expect(200)).body).toEqual({ ring: '', madeAt: null });
  await lab.as('operator', 'PUT', path).send({ ring: 'the desk' }).expect(403);
  expect((await lab.as('keeper', 'PUT', path).send({ ring: ' ' }).expect(400)).body.errors[0].message).toBe('say whom to ring and how');
  const { body } = await lab.as('keeper', 'PUT', path).send({ ring: 'the desk, 204' }).expect(200);
  const read = async () =>
    (
      await request(lab.built.app)
        .get(`/api${new URL(body.address as string).pathname}`)
        .expect(200)
    ).body;
  expect(await read()).toMatchObject({ state: 'free', untilAt: null, ring: 'the desk, 204', rigName: 'North bench' });
  await lab.arm(10);
  const armed = await read();
  expect(armed).toMatchObject({ state: 'armed' });
  expect(Math.abs(Date.parse(armed.untilAt) - lab.clock.utcMs() - 10 * hour)).toBeLessThan(10 * minute);
  const runId = (await lab.askStart(protocolId).expect(201)).body.id as string;
  expect(await read()).toMatchObject({ state: 'run', untilAt: expect.any(String) });
  await lab.intervene(runId, 'stop').expect(202);
  await lab.until(runId, 'stopped');
  expect(await read()).toMatchObject({ state: 'free' });
  expect(Object.keys(await read()).sort()).toEqual(
    ['labName', 'nextAt', 'onCall', 'ring', 'rigName', 'serverAt', 'state', 'timeZone', 'untilAt'].sort(),
  );
  await lab.as('keeper', 'DELETE', path).expect(204);
  await request(lab.built.app)
    .get(`/api${new URL(body.address as string).pathname}`)
    .expect(404);
});
