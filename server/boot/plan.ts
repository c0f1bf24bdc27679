import { parseArgs } from 'node:util';
import { adviseNight } from '@/shared/planning/advise-night';
import { peakExcursionRad } from '@/shared/planning/excursion';
import { predictedSignalU } from '@/shared/planning/budget-first';
import { uIsPlanned } from '@/shared/planning/planned-method';
import { predictU } from '@/shared/planning/plan-uncertainty';
import { alternatives, cadenceOf, type Alternative } from '@/shared/planning/strategies';
import { adviseProtocol } from '@/shared/protocol/advise';
import { checkProtocol } from '@/shared/protocol/check';
import type { ProtocolDocument } from '@/shared/protocol/document';
import type { Finding } from '@/shared/protocol/finding';
import { predictSignal } from '@/shared/protocol/predict';
import { planTimeline } from '@/shared/protocol/timeline';
import type { RigDocument } from '@/shared/rig/document';
import { type Choice, chosenProtocol, listed, Unusable } from './chosen-protocol';

/** `npm run -s plan -- (PROTOCOL.json | --template NAME) [--rig RIG.json]`: what a protocol takes and gives on a rig. */

const usage = 'Usage: npm run -s plan -- (PROTOCOL.json | --template NAME) [--rig RIG.json]';

/** A plan is made as if begun at this instant, homed, in UTC. */
const startUtcMs = Date.UTC(2000, 0, 1);

export interface Plan {
  duration_s: number;
  /** Near minus far, rad; null where the rig does not tell. */
  signal_rad: number | null;
  /** Standard uncertainty that the stated ones of the rig leave it; null where they leave none. */
  signal_u_rad: number | null;
  /** The same on the scale, m. */
  signal_m: number | null;
  signal_u_m: number | null;
  /** Of G after the night by near minus far; null where the rig or the protocol does not tell, or another method is registered (`u-not-planned`). */
  relativeU: number | null;
  u_by_source: Record<string, number> | null;
  advice: Finding[];
  bestDwell_s: number | null;
  peakExcursion_rad: number | null;
  alternatives: Alternative[];
}

/**
 * Plans a document on a rig.
 * @throws Unusable for a protocol that is refused.
 */
export function makePlan(document: ProtocolDocument, rig: RigDocument): Plan {
  const start = { utcMs: startUtcMs, angleDeg: rig.motion?.homeDeg ?? 0 };
  const refusals = checkProtocol(document, rig, start);
  if (refusals.length > 0) throw new Unusable(`The protocol "${document.name}" is refused:\n${listed(refusals)}`);
  const timeline = planTimeline({ protocol: document, rig, timeZone: 'UTC' }, start);
  const signal = predictSignal(rig);
  const signalU = predictedSignalU(rig);
  const cadence = cadenceOf(timeline, rig);
  const predicted = cadence === null || !uIsPlanned(document) ? null : predictU(rig, cadence);
  const others = alternatives(rig, { durationS: timeline.durationS, calibrations: cadence?.calibrations ?? [] });
  const peak = peakExcursionRad(rig, timeline);
  return {
    duration_s: Math.round(timeline.durationS * 1e6) / 1e6,
    signal_rad: signal?.signalRad ?? null,
    signal_u_rad: uOf(signal?.signalRad, signalU?.angle),
    signal_m: signal?.signalM ?? null,
    signal_u_m: uOf(signal?.signalM, signalU?.onScale),
    relativeU: predicted?.relativeU ?? null,
    u_by_source: predicted?.bySource ?? null,
    advice: [...adviseProtocol(document, rig, start), ...adviseNight(rig, { predicted, peakRad: peak })],
    bestDwell_s: others.find(({ strategy }) => strategy === 'plain')?.dwell_s ?? null,
    peakExcursion_rad: peak,
    alternatives: others,
  };
}

const uOf = (value: number | null | undefined, relative: number | undefined): number | null =>
  value == null || relative === undefined ? null : Math.abs(value) * relative;

function chosen(args: readonly string[]): Choice {
  const { values, positionals } = parsedArguments(args);
  return chosenProtocol({ positionals, template: values.template, rig: values.rig, usage });
}

function parsedArguments(args: readonly string[]) {
  try {
    return parseArgs({ args: [...args], options: { template: { type: 'string' }, rig: { type: 'string' } }, allowPositionals: true });
  } catch (error) {
    throw new Unusable(`${error instanceof Error ? error.message : String(error)}\n${usage}`);
  }
}

export interface Output {
  out: (text: string) => void;
  err: (text: string) => void;
}

const toProcess: Output = { out: (text) => process.stdout.write(text), err: (text) => process.stderr.write(text) };

/** The command: one JSON object on `out` and 0, or a message on `err` and 2. `args` are those after the command's name. */
export function main(args: readonly string[], output: Output = toProcess): number {
  try {
    const { document, rig } = chosen(args);
    output.out(`${JSON.stringify(makePlan(document, rig), null, 2)}\n`);
    return 0;
  } catch (error) {
    if (error instanceof Unusable) output.err(`plan: ${error.message}\n`);
    else throw error;
    return 2;
  }
}

if (require.main === module) process.exitCode = main(process.argv.slice(2));
