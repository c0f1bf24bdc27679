import type { RunStart, SimulatedRun } from '@/shared/archive/run-records';
import { CODATA_2022_G } from '@/shared/physics/constants';
import type { ProtocolDocument } from '@/shared/protocol/document';
import { demoRigWide } from '@/shared/rig/demo-rigs';

/** A run of a soak: on the wide demo rig, armed as a rehearsal is. */
export function soakStart(
  protocol: ProtocolDocument,
  { seed, faults = [] }: { seed: number; faults?: SimulatedRun['faults'] },
): RunStart & { simulated: SimulatedRun } {
  return {
    labId: 'soak',
    runId: '00000000-0000-8000-8000-000000000001',
    rigId: 'emulated',
    rigName: 'Emulated board',
    rigRevision: 1,
    protocolName: protocol.name,
    protocolRevision: 1,
    rig: demoRigWide,
    protocol,
    massSetLabel: 'lead',
    timeZone: 'UTC',
    operator: 'soak',
    notes: '',
    arm: null,
    simulated: { trueG: CODATA_2022_G.value, seed, rateHz: 1, faults },
  };
}
