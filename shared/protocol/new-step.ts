import type { RigDocument } from '../rig/document';
import type { ProtocolDocument, Step, StepKind } from './document';

/** A new step of the kind as the editor puts it in, with values that make sense on the rig. */
export function newStep(kind: StepKind, rig: RigDocument): Step {
  const names = Object.keys(rig.stations);
  const station = names.includes('near') ? 'near' : (names[0] ?? 'near');
  switch (kind) {
    case 'home':
      return { kind };
    case 'swing':
      return { kind, to: station };
    case 'dwell':
      return rig.measured?.period_s === undefined ? { kind, for_s: 900 } : { kind, periods: 2 };
    case 'kick':
      return { kind, amplitude_urad: 2000 };
    case 'settle':
      return { kind, for_s: 600 };
    case 'wait':
      return { kind, until: { localTime: '22:00' } };
    case 'proof':
      return { kind };
    case 'mark':
      return { kind, label: 'Mark' };
    case 'prompt':
      return { kind, text: 'Hands clear of the rig' };
    case 'rotate':
      return { kind, period_s: 1800, turns: Math.min(4, Math.max(1, Math.floor(rig.motion?.turnsLimit ?? 0))) };
    case 'repeat':
      return { kind, times: 2, steps: [] };
  }
}

/** The document of a protocol begun from nothing. */
export function emptyDocument(name: string): ProtocolDocument {
  return {
    formatVersion: 1,
    name,
    notes: '',
    onInterruption: 'hold',
    evaluation: { method: 'equilibrium', drift: 'aba', channel: 'deflection' },
    steps: [],
  };
}
