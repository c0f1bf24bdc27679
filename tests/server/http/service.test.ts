import { readFileSync } from 'node:fs';
import { join } from 'node:path';
import Ajv2020 from 'ajv/dist/2020';
import addFormats from 'ajv-formats';
import { routes } from '@/shared/contracts';
import { templates } from '@/shared/protocol/templates';
import { demoRigWide } from '@/shared/rig/demo-rigs';
import { databaseOfThisFile } from '@/tests/support/database';
import { LabServer } from '@/tests/support/lab-server';

const database = databaseOfThisFile();
let lab: LabServer;
beforeAll(async () => {
  lab = await LabServer.start(database());
}, 60_000);
afterAll(() => lab.stop());

test('health tells whether the database answers', async () => {
  expect((await lab.as('viewer', 'GET', '/health').expect(200)).body).toMatchObject({
    ok: true,
    demo: true,
    serverAt: new Date(lab.clock.utcMs()).toISOString(),
  });
  const { pool } = lab.services.database;
  const query = pool.query.bind(pool);
  Object.assign(pool, { query: () => Promise.reject(new Error('gone')) });
  expect((await lab.as('viewer', 'GET', '/health').expect(200)).body.ok).toBe(false);
  Object.assign(pool, { query });
});

test('the OpenAPI description holds every route, and each of its schemas is valid JSON Schema 2020-12', async () => {
  const { body } = await lab.as('viewer', 'GET', '/openapi.json').expect(200);
  expect(body.openapi).toBe('3.1.0');
  const operations = Object.values(body.paths as Record<string, Record<string, { operationId: string }>>).flatMap((path) =>
    Object.values(path).map(({ operationId }) => operationId),
  );
  expect(operations.sort()).toEqual(routes.map(({ name }) => name).sort());
  expect(body.paths['/api/labs/{labId}/runs'].post['x-roles']).toEqual(['owner', 'keeper', 'operator']);

  const ajv = addFormats(new Ajv2020({ strict: false }));
  ajv.addSchema({ $id: 'api', ...body });
  const refs = new Set(JSON.stringify(body).match(/#\/components\/schemas\/[\w.]+/g));
  expect(refs.size).toBeGreaterThan(3);
  for (const ref of refs) expect(() => ajv.compile({ $ref: `api${ref}` })).not.toThrow();
  const validate = ajv.compile({ $ref: 'api#/components/schemas/ProtocolDocument' });
  for (const template of templates)
    expect({ id: template.id, valid: validate(template.make(demoRigWide)), errors: validate.errors }).toMatchObject({ valid: true });
});

test('the schema of the protocol document takes the templates and refuses what the format does not know', async () => {
  const { body } = await lab.as('viewer', 'GET', '/schemas/protocol-1.json').expect(200);
  const validate = addFormats(new Ajv2020({ strict: false })).compile(body);
  for (const template of templates) expect(validate(template.make(demoRigWide))).toBe(true);
  expect(validate({ formatVersion: 1, name: 'x', steps: [{ kind: 'leap' }] })).toBe(false);
  expect(validate({ formatVersion: 1, name: 'x', steps: [{ kind: 'home' }], colour: 'red' })).toBe(false);
  expect(validate({ formatVersion: 1, name: 'x', steps: [{ kind: 'dwell', for_s: 60, periods: 2 }] })).toBe(false);
  expect(body).toEqual(JSON.parse(readFileSync(join(__dirname, '../../../public/schemas/protocol-1.json'), 'utf8')));
});
