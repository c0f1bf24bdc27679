import { demoIds } from '@/db/demo/seed';
import { demoRigWide } from '@/shared/rig/demo-rigs';
import type { ProtocolDocument, RepeatStep } from '@/shared/protocol/document';
import { templates } from '@/shared/protocol/templates';
import { Lab } from './lab';

const base = `/labs/${demoIds.lab}`;

/** The short template with so many pairs of beats and without its kick: home, swing to near, pairs of 2 · 840 s. */
export function shortNight(name: string, pairs: number): ProtocolDocument {
  const template = templates.find(({ id }) => id === 'near-far-short');
  if (template === undefined) throw new Error('the short template is gone');
  const document = template.make(demoRigWide);
  return {
    ...document,
    name,
    steps: document.steps
      .filter(({ kind }) => kind !== 'kick')
      .map((step) => (step.kind === 'repeat' ? ({ ...step, times: pairs } as RepeatStep) : step)),
  };
}

/** Makes and issues a protocol. */
export async function issued(lab: Lab, document: ProtocolDocument): Promise<{ protocolId: string; revision: number }> {
  const { server } = lab;
  const made = await server.as('operator', 'POST', `${base}/protocols`).send({ document }).expect(201);
  const protocolId = String(made.body.id);
  const { headers } = await server.as('operator', 'GET', `${base}/protocols/${protocolId}`).expect(200);
  await server
    .as('operator', 'POST', `${base}/protocols/${protocolId}/revisions`)
    .set('If-Match', String(headers.etag))
    .send({ rigId: demoIds.rig, note: '' })
    .expect(201);
  return { protocolId, revision: 1 };
}

/** Starts an issued protocol on the armed demo rig. */
export async function started(lab: Lab, protocol: { protocolId: string; revision: number }): Promise<string> {
  const run = await lab.server.askStart(protocol.protocolId, { revision: protocol.revision }).expect(201);
  return String(run.body.id);
}

/** What the API says of a run or of a part of it. */
export async function read(lab: Lab, path: string) {
  return (await lab.server.as('viewer', 'GET', `${base}/runs${path.startsWith('?') ? '' : '/'}${path}`).expect(200)).body;
}

/** A whole night on the demo rig, started and finished before anybody looks. Returns the run's id. */
export async function finishedNight(lab: Lab, pairs = 2): Promise<string> {
  await lab.server.arm(20);
  const runId = await started(lab, await issued(lab, shortNight('Short night', pairs)));
  await lab.pass(pairs * 1680 + 60);
  const { state, reason } = await read(lab, runId);
  if (state !== 'finished') throw new Error(`the night is ${state}: ${reason}`);
  return runId;
}
