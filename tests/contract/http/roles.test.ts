import { demoIds, demoPeople } from '@/db/demo/seed';
import { routes } from '@/shared/contracts';
import { problemCodes, problemSchema } from '@/shared/contracts/problem';
import { acts, may, roles, type Act, type Role } from '@/shared/contracts/roles';
import type { RouteContract } from '@/shared/contracts/route';
import { databaseOfThisFile } from '@/tests/support/database';
import { foreignLab } from '@/tests/support/foreign-lab';
import { LabServer } from '@/tests/support/lab-server';
import { rows, shortProtocol, type Row, type Things } from './role-rows';

const database = databaseOfThisFile();
let lab: LabServer;
let address: string;
let own: Things;
let foreign: Things;
let stranger: Record<Role, string>;

const ownerOf = { own: demoPeople.find(({ role }) => role === 'owner')?.id ?? '', foreign: '' };

beforeAll(async () => {
  const db = database();
  lab = await LabServer.start(db);
  address = await lab.built.listen();
  const other = await foreignLab(db, lab.clock.utcMs());
  stranger = other.userOf;
  ownerOf.foreign = other.userOf.owner;
  for (const userId of Object.values(stranger)) await lab.signIn(userId);
  const rig = await lab.as({ userId: ownerOf.foreign }, 'GET', `/labs/${other.labId}/rigs/${other.rigId}`).expect(200);
  await lab.services.stations.put({ labId: other.labId, id: other.rigId, document: rig.body.document, link: { kind: 'simulated' } });
  own = await thingsOf(ownerOf.own, { labId: demoIds.lab, rigId: demoIds.rig });
  foreign = await thingsOf(ownerOf.foreign, { labId: other.labId, rigId: other.rigId });
}, 120_000);
afterAll(() => lab.stop());

/** One of everything in a lab, made through the API by its owner. */
async function thingsOf(userId: string, { labId, rigId }: { labId: string; rigId: string }): Promise<Things> {
  const ask = (method: string, path: string) => lab.as({ userId }, method, `/labs/${labId}${path}`);
  const rig = await ask('GET', `/rigs/${rigId}`).expect(200);
  const protocol = await ask('POST', '/protocols')
    .send({ document: shortProtocol('There and back') })
    .expect(201);
  const protocolEtag = protocol.headers.etag as string;
  await ask('POST', `/protocols/${protocol.body.id}/revisions`).set('If-Match', protocolEtag).send({ rigId }).expect(201);
  const run = await ask('POST', '/rehearsals').send({ rigId, protocolId: protocol.body.id, revision: 1 }).expect(202);
  await lab.advance(31_000);
  const evaluation = await ask('POST', `/runs/${run.body.id}/evaluations`).send({}).expect(202);
  const file = await ask('POST', `/runs/${run.body.id}/imports`).send({ fileName: 'deflection.csv' }).expect(201);
  await ask('PUT', `/imports/${file.body.id}/content`).set('Content-Type', 'text/csv').send(rows.putImportContent?.raw).expect(200);
  const samples = await ask('GET', `/runs/${run.body.id}/samples`).expect(200);
  const invitation = await ask('POST', '/invitations')
    .send({ email: `guest.${labId}@quillfen.example`, role: 'viewer' })
    .expect(201);
  return {
    labId,
    rigId,
    massSetId: rig.body.massSets[0].id,
    protocolId: protocol.body.id,
    protocolEtag,
    runId: run.body.id,
    channelId: samples.body.channel.id,
    importId: file.body.id,
    evaluationId: evaluation.body.id,
    invitationId: invitation.body.id,
    userId,
  };
}

interface Answer {
  status: number;
  body: unknown;
}

const rowOf = (contract: RouteContract): Row => {
  const row = rows[contract.name];
  if (row === undefined) throw new Error(`the matrix has no row for ${contract.name}`);
  return row;
};

async function send(
  contract: RouteContract,
  cookie: string,
  { things = own, row = rowOf(contract) }: { things?: Things; row?: Row } = {},
): Promise<Answer> {
  const params = row.params?.(things) ?? {};
  const path = contract.path.replaceAll(/:(\w+)/g, (_, name: string) => encodeURIComponent(params[name] ?? ''));
  const query = row.query === undefined ? '' : `?${new URLSearchParams(row.query(things)).toString()}`;
  const headers: Record<string, string> = {
    cookie,
    origin: address,
    'idempotency-key': crypto.randomUUID(),
    ...(row.ifMatch === undefined ? {} : { 'if-match': row.ifMatch(things) }),
  };
  const body = row.raw ?? (row.body === undefined ? null : JSON.stringify(row.body(things)));
  if (body !== null)
    headers['content-type'] = row.raw === undefined ? 'application/json' : (contract.consumes?.replace('*', 'png') ?? 'text/csv');
  const controller = new AbortController();
  const response = await fetch(`${address}/api${path}${query}`, { method: contract.method, headers, body, signal: controller.signal });
  if (contract.produces === 'text/event-stream' && response.status === 200) {
    controller.abort();
    return { status: 200, body: null };
  }
  const text = await response.text();
  const isJson = response.headers.get('content-type')?.match(/[/+]json/) != null;
  if (response.status >= 400) expect(response.headers.get('content-type')).toBe('application/problem+json; charset=utf-8');
  return { status: response.status, body: isJson ? (JSON.parse(text) as unknown) : text };
}

function expectProblem(answer: Answer, code: keyof typeof problemCodes): void {
  const problem = problemSchema.parse(answer.body);
  expect(problem).toMatchObject({ code, status: problemCodes[code], type: `/problems/${code}` });
  expect(answer.status).toBe(problemCodes[code]);
  expect(problem.detail).not.toMatch(/node_modules|\.ts\b|Error:|select |insert /);
}

/** Each sign-out ends its session, so it gets one of its own. */
async function cookieFor(contract: RouteContract, userId: string): Promise<string> {
  if (contract.name === 'signOut') await lab.signIn(userId);
  const cookie = lab.cookie({ userId });
  if (contract.name === 'signOut') await lab.signIn(userId);
  return cookie;
}

const idOf = (role: Role) => demoPeople.find((person) => person.role === role)?.id ?? '';
const isAct = (access: RouteContract['access']): access is Act => access in acts;
const cases = routes.map((contract) => [contract.name, contract] as const);

test('every route has a row, and every row a route', () => {
  expect(Object.keys(rows).sort()).toEqual(routes.map(({ name }) => name).sort());
});

test('Express answers the routes of the contracts and no others', () => {
  interface Layer {
    route?: { path: string; methods: Record<string, boolean> };
    handle?: { stack?: Layer[] };
  }
  const api = (lab.built.app as unknown as { router: { stack: Layer[] } }).router.stack.flatMap(({ handle }) => handle?.stack ?? []);
  const mounted = api.flatMap(({ route }) =>
    route === undefined ? [] : Object.keys(route.methods).map((method) => `${method.toUpperCase()} ${route.path}`),
  );
  const described = routes.map(({ method, path }) => `${method} ${path}`);
  // The web application's own pages, and the page of a problem's code.
  const pages = ['GET /', 'GET /{*rest}', 'GET /:code'];
  expect(mounted.filter((entry) => !pages.includes(entry)).sort()).toEqual(described.sort());
});

describe.each(cases)('%s', (_name, contract) => {
  if (contract.access === 'public' || contract.access === 'device') {
    test('answers without a session', async () => {
      expect((await send(contract, '')).status).toBe(rowOf(contract).allowed);
    });
    return;
  }

  test('asks to sign in', async () => {
    expectProblem(await send(contract, ''), 'not-signed-in');
    expectProblem(await send(contract, `ef=${'x'.repeat(43)}`), 'session-expired');
  });

  test.each(roles)('%s of the lab', async (role) => {
    const answer = await send(contract, await cookieFor(contract, idOf(role)));
    if (isAct(contract.access) && !may(role, contract.access)) expectProblem(answer, 'not-allowed');
    else expect(answer).toMatchObject({ status: rowOf(contract).allowed });
  });

  if (!isAct(contract.access)) return;

  test.each(roles)('%s of another lab', async (role) => {
    expectProblem(await send(contract, lab.cookie({ userId: stranger[role] })), 'not-found');
  });

  const named = [...contract.path.matchAll(/:(\w+)/g)]
    .map(([, name]) => name as string)
    .filter((name) => name !== 'labId' && name !== 'revision');
  if (named.length === 0) return;

  test('ids of another lab under the own lab are unknown', async () => {
    const mixed = { ...foreign, labId: own.labId };
    expectProblem(await send(contract, lab.cookie('owner'), { things: mixed }), 'not-found');
  });
});

test('things of another lab named in a body are unknown', async () => {
  const tap = { tappedAt: new Date(lab.clock.utcMs()).toISOString(), reviewToken: 'none' };
  const start = { rigId: own.rigId, protocolId: own.protocolId, revision: 1, massSetId: own.massSetId, ...tap };
  for (const change of [{ rigId: foreign.rigId }, { protocolId: foreign.protocolId }, { massSetId: foreign.massSetId }]) {
    const answer = await lab.as('owner', 'POST', `/labs/${own.labId}/runs`).send({ ...start, ...change });
    expectProblem(answer, 'not-found');
  }
  expectProblem(
    await lab.as('owner', 'POST', `/labs/${own.labId}/rehearsals`).send({ rigId: foreign.rigId, protocolId: own.protocolId }),
    'not-found',
  );
  expectProblem(
    await lab
      .as('owner', 'POST', `/labs/${own.labId}/protocols/${own.protocolId}/revisions`)
      .set('If-Match', own.protocolEtag)
      .send({ rigId: foreign.rigId }),
    'not-found',
  );
});

test('every property that a body does not know is refused', async () => {
  const withBody = routes.filter(({ body, access }) => body !== undefined && access !== 'public');
  for (const contract of withBody) {
    const row = rowOf(contract);
    const spoilt = { ...row, body: (things: Things) => ({ ...(row.body?.(things) as object), isOwner: true }) };
    const answer = await send(contract, lab.cookie('owner'), { row: spoilt });
    expect({ route: contract.name, status: answer.status, body: answer.body }).toMatchObject({
      route: contract.name,
      status: 400,
      body: { code: 'invalid-input' },
    });
  }
});
