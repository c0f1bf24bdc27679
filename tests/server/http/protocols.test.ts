import canonicalize from 'canonicalize';
import { demoIds } from '@/db/demo/seed';
import type { ProtocolDocument } from '@/shared/protocol/document';
import { databaseOfThisFile } from '@/tests/support/database';
import { LabServer, sha256 } from '@/tests/support/lab-server';

const database = databaseOfThisFile();
let lab: LabServer;
beforeAll(async () => {
  lab = await LabServer.start(database());
}, 60_000);
afterAll(() => lab.stop());

const protocols = `/labs/${demoIds.lab}/protocols`;
const document = (name: string, to: string = 'near'): ProtocolDocument => ({
  formatVersion: 1,
  name,
  steps: [
    { kind: 'home' },
    {
      kind: 'repeat',
      times: 2,
      steps: [
        { kind: 'swing', to },
        { kind: 'dwell', for_s: 600 },
      ],
    },
  ],
});

const make = async (name: string, of: ProtocolDocument = document(name)) => {
  const answer = await lab.as('operator', 'POST', protocols).send({ document: of }).expect(201);
  return { id: answer.body.id as string, etag: answer.headers.etag as string, body: answer.body };
};
const save = ({ id, etag }: { id: string; etag: string }, of: ProtocolDocument, who: 'operator' | 'keeper' = 'operator') =>
  lab.as(who, 'PUT', `${protocols}/${id}`).set('If-Match', etag).send({ document: of });
const issue = (id: string, etag: string) =>
  lab.as('operator', 'POST', `${protocols}/${id}/revisions`).set('If-Match', etag).send({ rigId: demoIds.rig, note: 'for tonight' });

describe('a draft', () => {
  test('is made, read, saved and deleted; counts its steps and nested ones', async () => {
    const made = await make('Two pairs');
    expect(made.body).toMatchObject({
      name: 'Two pairs',
      latestRevision: null,
      draftDiffers: true,
      stepCount: 4,
      updatedBy: 'Ilse Marrowby',
      revisions: [],
    });
    const read = await lab.as('viewer', 'GET', `${protocols}/${made.id}`).expect(200);
    expect(read.headers.etag).toBe(made.etag);
    const saved = await save(made, document('Two pairs, far', 'far')).expect(200);
    expect(saved.body).toMatchObject({ name: 'Two pairs, far', document: document('Two pairs, far', 'far') });
    expect(saved.headers.etag).not.toBe(made.etag);
    await lab.as('operator', 'DELETE', `${protocols}/${made.id}`).expect(204);
    await lab.as('operator', 'GET', `${protocols}/${made.id}`).expect(404);
  });

  test('saved by two editors: the second is told who was faster and when, in the time of the lab, and nothing is overwritten', async () => {
    const made = await make('Shared');
    await lab.advance(60_000);
    await save(made, document('Shared', 'far'), 'keeper').expect(200);
    const second = await save(made, document('Mine')).expect(412);
    const clock = new Intl.DateTimeFormat('en-GB', {
      timeZone: 'Europe/Zurich',
      hour: '2-digit',
      minute: '2-digit',
      second: '2-digit',
    }).format(lab.clock.utcMs());
    expect(second.body).toMatchObject({ code: 'edited-meanwhile' });
    expect(second.body.detail).toContain(`Casimir Thornquist saved this protocol at ${clock} Fri, Europe/Zurich`);
    expect((await lab.as('operator', 'GET', `${protocols}/${made.id}`)).body.name).toBe('Shared');
  });

  test('saved by both at the same instant: one gets through', async () => {
    const made = await make('Race');
    const answers = await Promise.all([save(made, document('One')), save(made, document('Two'), 'keeper')]);
    expect(answers.map(({ status }) => status).sort()).toEqual([200, 412]);
  });

  test('saved unchanged keeps its version', async () => {
    const made = await make('Same');
    expect((await save(made, document('Same')).expect(200)).headers.etag).toBe(made.etag);
  });

  test('with an unknown field is refused at its place', async () => {
    const answer = await lab
      .as('operator', 'POST', protocols)
      .send({ document: { ...document('Odd'), steps: [{ kind: 'swing', to: 'near', speed: 3 }] } })
      .expect(400);
    expect(answer.body.errors[0].path).toBe('document.steps.0.speed');
  });
});

describe('a revision', () => {
  test('is issued from the draft, numbered, hashed over the canonical document, and never changes', async () => {
    const made = await make('Issued');
    const first = await issue(made.id, made.etag).expect(201);
    expect(first.body).toMatchObject({
      number: 1,
      note: 'for tonight',
      issuedBy: 'Ilse Marrowby',
      document: document('Issued'),
      sha256: sha256(canonicalize(document('Issued')) ?? ''),
    });
    expect((await lab.as('viewer', 'GET', `${protocols}/${made.id}`)).body).toMatchObject({ latestRevision: 1, draftDiffers: false });
    const saved = await save(made, document('Issued', 'far')).expect(200);
    expect(saved.body.draftDiffers).toBe(true);
    const second = await issue(made.id, saved.headers.etag as string).expect(201);
    expect(second.body.number).toBe(2);
    expect((await lab.as('viewer', 'GET', `${protocols}/${made.id}/revisions/1`).expect(200)).body).toEqual(first.body);
    await expect(
      database().connection.pool.query(`update protocol_revisions set note = 'x' where protocol_id = '${made.id}'`),
    ).rejects.toThrow('never changed');
    await lab.as('operator', 'DELETE', `${protocols}/${made.id}`).expect(409);
  });

  test('of an unchanged draft is not issued twice', async () => {
    const made = await make('Once');
    await issue(made.id, made.etag).expect(201);
    expect((await issue(made.id, made.etag).expect(409)).body.detail).toContain('Nothing has changed since revision 1');
  });

  test('of a draft that somebody saved meanwhile is not issued', async () => {
    const made = await make('Late');
    await save(made, document('Late', 'far'), 'keeper').expect(200);
    expect((await issue(made.id, made.etag).expect(412)).body.code).toBe('edited-meanwhile');
  });

  test('is refused where the rig knows no such station, naming the step and what there is', async () => {
    const made = await make('Lost', document('Lost', 'behind the door'));
    const answer = await issue(made.id, made.etag).expect(422);
    expect(answer.body.code).toBe('protocol-refused');
    expect(answer.body.errors[0].path).toBe('2.repeat.1.swing');
    expect(answer.body.errors[0].message).toMatch(/behind the door.*near/s);
  });

  test('with a number that is none is unknown', async () => {
    for (const number of ['9', 'x', '1.5', '99999999999999999999'])
      await lab.as('viewer', 'GET', `${protocols}/${demoIds.shortProtocol}/revisions/${number}`).expect(404);
  });
});
