import { demoIds, demoLab, demoPeople, demoRigName } from '@/db/demo/seed';
import type { RunStart } from '@/shared/archive/run-records';
import { CODATA_2022_G } from '@/shared/physics/constants';
import { templates } from '@/shared/protocol/templates';
import { demoRigWide } from '@/shared/rig/demo-rigs';
import { rehearsalJobKind, type RehearsalJob } from '../http/work/rehearsal-job';
import type { Connection } from '../store/database';
import { enqueueJob } from '../store/jobs';
import { insertRun } from '../store/run-store';

/** The rehearsal lies so far back that its night is over when the newcomer looks at it. */
const agoMs = 4 * 3_600_000;
const runId = '5eed0000-0000-4000-8000-000000000107';

/** Queues one rehearsal of the demo lab's short protocol, so that a newcomer finds a finished night to evaluate. */
export async function queueDemoRehearsal({ db }: Connection, nowUtcMs: number): Promise<void> {
  const protocol = templates.find(({ id }) => id === 'near-far-short')?.make(demoRigWide);
  const operator = demoPeople.find(({ role }) => role === 'operator');
  if (protocol === undefined || operator === undefined) throw new Error('the demo lab has no short protocol or no operator');
  const start: RunStart = {
    labId: demoIds.lab,
    runId,
    rigId: demoIds.rig,
    rigName: demoRigName,
    rigRevision: 1,
    protocolName: protocol.name,
    protocolRevision: 1,
    rig: demoRigWide,
    protocol,
    massSetLabel: 'As in the rig document',
    timeZone: demoLab.timeZone,
    operator: operator.name,
    notes: 'Made with the demo lab.',
    arm: null,
    simulated: { trueG: CODATA_2022_G.value, seed: 1, rateHz: 10, faults: [] },
  };
  const payload: RehearsalJob = { labId: demoIds.lab, runId };
  await db.transaction(async (tx) => {
    await insertRun(tx, {
      start,
      protocolId: demoIds.shortProtocol,
      massSetId: null,
      startedById: null,
      state: 'rehearsing',
      nowUtcMs: nowUtcMs - agoMs,
      predictedEndUtcMs: null,
    });
    await enqueueJob(tx, { kind: rehearsalJobKind, payload, labId: demoIds.lab, nowUtcMs, maxAttempts: 2 });
  });
}
