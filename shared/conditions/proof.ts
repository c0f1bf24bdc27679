import type { ProofStep } from '../protocol/document';
import { pendulumOf, predictSignal, standingAt } from '../protocol/predict';
import type { RigDocument } from '../rig/document';
import type { DwellFacts } from './dwell-verdict';

/** The proof of the first pair: is the night worth running? Compared with the plan, by the limits of the step. */

export type ProofTest = 'sign' | 'size' | 'period' | 'residual' | 'edge';

export interface ProofItem {
  test: ProofTest;
  /** Null where it cannot be told; then it stands against the night where it was asked for. */
  ok: boolean | null;
  /** In a sentence: what was found, what was planned. */
  words: string;
}

export interface ProofFacts {
  near: DwellFacts | null;
  far: DwellFacts | null;
  /** Shift of the home edge at its last pass, deg; null where it was never passed since homing. */
  edgeDeg: number | null;
}

const limits = { sign: true, size: 0.2, period: 0.03, residual: 3, edge_deg: 0.02 } as const;

/** Every test that the step asks for; null leaves one out. */
export function judgeProof(step: ProofStep, rig: RigDocument, facts: ProofFacts): ProofItem[] {
  const asked = <K extends keyof typeof limits>(key: K) => (step[key] === undefined ? limits[key] : step[key]);
  // An empty control has no signal to be planned, and hardly any ringing; what is left is looked at in the evaluation.
  const empty = rig.sources.shape === 'none';
  const size = asked('size');
  const period = asked('period');
  const residual = asked('residual');
  const edge = asked('edge_deg');
  return [
    ...(asked('sign') === true && !empty ? [signItem(rig, facts)] : []),
    ...(size === null || empty ? [] : [sizeItem(rig, facts, size as number)]),
    ...(period === null ? [] : [periodItem(rig, facts, period as number)].filter(({ ok }) => !(empty && ok === null))),
    ...(residual === null ? [] : residualItems(rig, facts, residual as number)),
    ...(edge === null ? [] : [edgeItem(facts, edge as number)]),
  ];
}

/** The night is sound when nothing that was asked for stands against it. */
export const isSound = (items: readonly ProofItem[]): boolean => items.every(({ ok }) => ok === true);

const milli = (rad: number) => `${(1000 * rad).toPrecision(3)} mrad`;
const percent = (share: number) => `${(100 * share).toPrecision(2)} %`;

function measured({ near, far }: ProofFacts): number | null {
  return near?.centreRad == null || far?.centreRad == null ? null : near.centreRad - far.centreRad;
}

const untold = (test: ProofTest, what: string): ProofItem => ({ test, ok: null, words: `${what} cannot be told` });

function signItem(rig: RigDocument, facts: ProofFacts): ProofItem {
  const found = measured(facts);
  const planned = plannedRad(rig);
  if (found === null || planned === null) return untold('sign', 'the sign of near minus far');
  const ok = found * planned > 0;
  return { test: 'sign', ok, words: ok ? 'near lies on its side of far' : 'near and far are on the wrong sides' };
}

function plannedRad(rig: RigDocument): number | null {
  return predictSignal(rig)?.signalRad ?? null;
}

function sizeItem(rig: RigDocument, facts: ProofFacts, limit: number): ProofItem {
  const found = measured(facts);
  const planned = plannedRad(rig);
  if (found === null || planned === null || planned === 0) return untold('size', 'near minus far');
  const off = Math.abs(Math.abs(found / planned) - 1);
  return {
    test: 'size',
    ok: off <= limit,
    words: `near minus far ${milli(found)}, planned ${milli(planned)}: ${percent(off)} off, ${percent(limit)} allowed`,
  };
}

function periodItem(rig: RigDocument, { near, far }: ProofFacts, limit: number): ProofItem {
  const pendulum = pendulumOf(rig);
  const found = [near, far].flatMap((dwell) => (dwell?.period == null ? [] : [{ dwell, period: dwell.period }]));
  const best = found.sort((a, b) => a.period.u - b.period.u)[0];
  // Without ringing there is nothing to tell the period by.
  if (pendulum === null || best === undefined || best.period.u > (limit * best.period.value) / 2) return untold('period', 'the period');
  const angleDeg = rig.stations[best.dwell.side ?? 'near']?.value ?? 0;
  const plannedS = (2 * Math.PI) / standingAt(pendulum, angleDeg).omega;
  const off = Math.abs(best.period.value / plannedS - 1);
  return {
    test: 'period',
    ok: off <= limit,
    words: `period ${best.period.value.toFixed(1)} s, planned ${plannedS.toFixed(1)} s: ${percent(off)} off, ${percent(limit)} allowed`,
  };
}

/** Without a documented noise there is nothing to compare with. */
function residualItems(rig: RigDocument, { near, far }: ProofFacts, limit: number): ProofItem[] {
  const noise = rig.noise?.readout_rad;
  if (noise === undefined || noise === 0) return [];
  const found = [near, far].flatMap((dwell) => (dwell?.residualRad == null ? [] : [dwell.residualRad]));
  if (found.length < 2) return [untold('residual', 'the noise about the fit')];
  const ratio = Math.max(...found) / noise;
  return [
    {
      test: 'residual',
      ok: ratio <= limit,
      words: `noise about the fit ${ratio.toPrecision(2)} times that of the rig document, ${limit} times allowed`,
    },
  ];
}

function edgeItem({ edgeDeg }: ProofFacts, limit: number): ProofItem {
  if (edgeDeg === null) return untold('edge', 'the shift of the home edge');
  const ok = Math.abs(edgeDeg) <= limit;
  return { test: 'edge', ok, words: `home edge moved by ${Math.abs(edgeDeg).toFixed(3)}°, ${limit}° allowed` };
}
