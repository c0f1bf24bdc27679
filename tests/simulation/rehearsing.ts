import type { RunStart, SimulatedRun } from '@/shared/archive/run-records';
import { CODATA_2022_G } from '@/shared/physics/constants';
import type { ProtocolDocument } from '@/shared/protocol/document';
import { demoRigWide } from '@/shared/rig/demo-rigs';
import { rehearsalParts } from '@/server/boot/rehearsal-parts';
import { type Rehearsal, rehearse } from '@/server/engine/rehearsal/rehearse';

export const startUtcMs = Date.UTC(2000, 0, 1);

/** Some four minutes with two reversals, so that hundreds of rehearsals fit into a test. */
export const shortProtocol: ProtocolDocument = {
  formatVersion: 1,
  name: 'Short',
  steps: [
    { kind: 'home' },
    { kind: 'swing', to: 'near' },
    { kind: 'dwell', for_s: 40 },
    {
      kind: 'repeat',
      times: 2,
      steps: [
        { kind: 'swing', to: 'far' },
        { kind: 'dwell', for_s: 40 },
        { kind: 'swing', to: 'near' },
        { kind: 'dwell', for_s: 40 },
      ],
    },
  ],
};

export function rehearsalStart(protocol: ProtocolDocument, simulated: Partial<SimulatedRun> = {}): RunStart & { simulated: SimulatedRun } {
  return {
    labId: 'rehearsal',
    runId: '00000000-0000-8000-8000-000000000001',
    rigId: 'simulated-rig',
    rigName: 'Simulated rig',
    rigRevision: 1,
    protocolName: protocol.name,
    protocolRevision: 1,
    rig: demoRigWide,
    protocol,
    massSetLabel: 'lead',
    timeZone: 'UTC',
    operator: 'rehearsal',
    notes: '',
    arm: null,
    simulated: { trueG: CODATA_2022_G.value, seed: 1, rateHz: 1, faults: [], ...simulated },
  };
}

export const runThrough = (protocol: ProtocolDocument, simulated: Partial<SimulatedRun> = {}): Promise<Rehearsal> =>
  rehearse({ start: rehearsalStart(protocol, simulated), startUtcMs }, rehearsalParts());
