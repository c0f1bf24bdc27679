import type { RigDocument } from '../rig/document';
import type { ProtocolDocument, Step } from './document';
import { shapedMoveCount } from './step-parts';
import { calm, kick, pair, restOfBeatS, restOfHourS, reversal, scanAngles, swing, usualCalmS } from './template-steps';

export interface Template {
  id: string;
  name: string;
  /** What it is for, in a sentence or two. */
  summary: string;
  /** The document for a rig, with lengths in periods of its pendulum. Steps that this version does not carry out are left out. */
  make(rig: RigDocument): ProtocolDocument;
  /** The rig it is meant for when it is planned or rehearsed from the command line: the empty control takes the spheres off. */
  rigFor(rig: RigDocument): RigDocument;
}

function document(name: string, parts: Pick<ProtocolDocument, 'notes' | 'steps'> & Partial<ProtocolDocument>): ProtocolDocument {
  return {
    formatVersion: 1,
    name,
    onInterruption: 'hold',
    evaluation: { method: 'equilibrium', drift: 'aba', channel: 'deflection' },
    ...parts,
  };
}

const atClear = (rig: RigDocument): Partial<ProtocolDocument> =>
  rig.stations['clear'] === undefined ? {} : { atEnd: { station: 'clear', drivers: 'keep' } };

const asItIs = (rig: RigDocument): RigDocument => rig;

/** The same rig with the sources taken off; what else turns along stays. */
export function withoutSources(rig: RigDocument): RigDocument {
  return { ...rig, sources: { ...rig.sources, shape: 'none' } };
}

const overnight = (rig: RigDocument, name: string, notes: string): ProtocolDocument =>
  document(name, {
    notes,
    ...atClear(rig),
    steps: [
      { kind: 'home' },
      swing('near'),
      ...pair,
      { kind: 'proof' },
      calm(usualCalmS),
      ...kick(rig, 'near', 4),
      { kind: 'repeat', times: 16, steps: pair },
      ...kick(rig, 'near', 4),
    ],
  });

const nearFar: Template = {
  id: 'near-far',
  name: 'Overnight reversals',
  summary:
    'The standard night: a first pair that proves it, a wait until the drift is small, 16 pairs of a far and a near dwell at a beat of two periods between two kicks that tell period and decay, then the sources turn clear.',
  make: (rig) => overnight(rig, 'Overnight reversals', ''),
  rigFor: asItIs,
};

const proof: Template = {
  id: 'proof',
  name: 'Proof hour',
  summary:
    'A kick and three reversals after any change to the rig and before a campaign: sign, size and period of the signal show whether it works.',
  make: (rig) =>
    document('Proof hour', {
      notes: '',
      steps: [
        { kind: 'home' },
        swing('near'),
        ...kick(rig, 'near', 3),
        ...reversal('far'),
        ...reversal('near'),
        ...reversal('far'),
        { kind: 'proof', otherwise: 'continue' },
      ],
    }),
  rigFor: asItIs,
};

const scan: Template = {
  id: 'scan',
  name: 'Torque scan',
  summary:
    'Dwells at a row of angles, up and down again: where the torque is zero and where it is greatest. For a new rig, or when the table was moved.',
  make: (rig) => {
    const up = scanAngles(rig);
    const [first, ...others] = up as [number, ...number[]];
    const again: Step = { kind: 'dwell', periods: 2 };
    // Every angle once on the way up and once on the way down: at the turning point a second dwell follows without a motion.
    const steps = [
      swing(first),
      ...kick(rig, first, 4),
      again,
      ...others.flatMap(reversal),
      again,
      ...up.slice(0, -1).reverse().flatMap(reversal),
    ];
    return document('Torque scan', { notes: '', steps: [{ kind: 'home' }, ...steps] });
  },
  rigFor: asItIs,
};

const still: Template = {
  id: 'still',
  name: 'Still night',
  summary:
    'An hour to settle and 32 dwells of two periods without any motion, a kick at the end: the noise and the drift of the rig in this room, before the first measurement of G.',
  make: (rig) =>
    document('Still night', {
      notes: '',
      steps: [
        { kind: 'home' },
        swing('near'),
        { kind: 'settle', for_s: 3600 },
        { kind: 'repeat', times: 32, steps: [{ kind: 'dwell', periods: 2 }] },
        ...kick(rig, 'near', 4),
      ],
    }),
  rigFor: asItIs,
};

const fourStation: Template = {
  id: 'four-station',
  name: 'Four stations, weekend',
  summary:
    'Near and far, then both turned by 180°, 23 times: tilt, magnetism and unequal balls change sign with the turn, gravity does not. For a rig that turns freely.',
  make: (rig) => {
    const turn = (from: string, to: string): Step[] => [swing(to), { kind: 'settle', for_s: restOfBeatS(rig, from, to) }];
    const back: Step[] = [...reversal('farBack'), ...reversal('nearBack')];
    const block: Step[] = [...pair, ...pair, ...turn('near', 'nearBack'), ...back, ...back, ...turn('nearBack', 'near')];
    return document('Four stations, weekend', {
      notes: '',
      ...atClear(rig),
      steps: [
        { kind: 'home' },
        swing('near'),
        ...pair,
        { kind: 'proof' },
        calm(restOfHourS(rig)),
        ...kick(rig, 'near', 4),
        { kind: 'repeat', times: 12, steps: block },
        ...kick(rig, 'near', 4),
        { kind: 'repeat', times: 11, steps: block },
        ...kick(rig, 'near', 4),
      ],
    });
  },
  rigFor: asItIs,
};

const nearFarShort: Template = {
  id: 'near-far-short',
  name: 'Short reversals',
  summary:
    'A kick, then six pairs of a far and a near dwell at a beat of two periods: a first value of G in about three hours, for demonstrations and rehearsals.',
  make: (rig) =>
    document('Short reversals', {
      notes: '',
      steps: [{ kind: 'home' }, swing('near'), ...kick(rig, 'near', 3), { kind: 'repeat', times: 6, steps: pair }],
    }),
  rigFor: asItIs,
};

const emptyControl: Template = {
  id: 'empty-control',
  name: 'Empty control',
  summary: 'The overnight reversals with nothing on the turntable: what remains of near minus far is not gravity of the sources.',
  make: (rig) =>
    overnight(
      rig,
      'Empty control',
      'Run this with the mass set "empty": the same steps as the overnight reversals, without the source masses.',
    ),
  rigFor: withoutSources,
};

const afternoon: Template = {
  id: 'afternoon',
  name: 'Teaching afternoon',
  summary: 'One slot with people in the room: hands clear and predictions handed in, then a kick and two pairs; time remains to evaluate.',
  make: (rig) =>
    document('Teaching afternoon', {
      notes: '',
      steps: [
        { kind: 'prompt', text: 'Hands clear of the rig, predictions handed in', atMost_s: 1800, otherwise: 'hold' },
        { kind: 'home' },
        swing('near'),
        ...kick(rig, 'near', 3),
        ...pair,
        ...pair,
      ],
    }),
  rigFor: asItIs,
};

/** Shaped swings take half a period more for each move beyond the first; a beat of three periods makes room for three. */
const shaped: Template = {
  id: 'shaped',
  name: 'Shaped reversals',
  summary:
    'The overnight reversals with swings that leave the pendulum nearly at rest, at the same beat: for a readout that is not linear, a high Q, or to check the plain ones.',
  make: (rig) => {
    const inTwo = shapedMoveCount(rig) === 2;
    const reversalTo = (to: string): Step[] => [
      { kind: 'swing', to, profile: 'shaped' },
      { kind: 'dwell', beat_periods: inTwo ? 2 : 3 },
    ];
    const shapedPair = [...reversalTo('far'), ...reversalTo('near')];
    // As long a night as the plain one: 16 pairs at two periods are 10 or 11 at three.
    return document('Shaped reversals', {
      notes: '',
      ...atClear(rig),
      steps: [
        { kind: 'home' },
        swing('near'),
        ...shapedPair,
        { kind: 'proof' },
        calm(usualCalmS),
        ...kick(rig, 'near', 4),
        { kind: 'repeat', times: inTwo ? 16 : 10, steps: shapedPair },
        ...kick(rig, 'near', 4),
      ],
    });
  },
  rigFor: asItIs,
};

const timeOfSwing: Template = {
  id: 'time-of-swing',
  name: 'Time of swing',
  summary:
    'Ring-downs with the sources in line with the arm and across it, four times: G from the two periods alone, without lever and scale. For a rig that turns freely.',
  make: (rig) => {
    const ring = (station: string): Step[] => [swing(station), ...kick(rig, station, 6)];
    return document('Time of swing', {
      notes: '',
      evaluation: { method: 'period', channel: 'deflection' },
      steps: [{ kind: 'home' }, { kind: 'repeat', times: 4, steps: [...ring('inline'), ...ring('across')] }],
    });
  },
  rigFor: asItIs,
};

/** The built-in templates, in the order in which they are offered. */
export const templates: readonly Template[] = [
  nearFar,
  nearFarShort,
  proof,
  scan,
  still,
  shaped,
  fourStation,
  afternoon,
  timeOfSwing,
  emptyControl,
];

/** The template with this id; undefined where there is none. */
export function templateById(id: string): Template | undefined {
  return templates.find((template) => template.id === id);
}
