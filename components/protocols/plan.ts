import { stepsOfPlan, type StripStep } from '@/components/charts/strip-model';
import { adviseProtocol } from '@/shared/protocol/advise';
import type { Surroundings } from '@/shared/protocol/advise-surroundings';
import { checkProtocol } from '@/shared/protocol/check';
import type { ProtocolDocument } from '@/shared/protocol/document';
import type { Finding } from '@/shared/protocol/finding';
import { predictedSignalU } from '@/shared/planning/budget-first';
import { predictDeflection, predictSignal, type PredictedSignal } from '@/shared/protocol/predict';
import { planTimeline, type Timeline, type TimelineItem } from '@/shared/protocol/timeline';
import type { RigDocument } from '@/shared/rig/document';

/** What a protocol would do on a rig, for the editor and for miniatures. Pure. */

export interface StepSpan {
  /** Length of the first time the step is carried out; for a repeat from its first step to its last, all passes. */
  durationS: number;
  /** How often it is carried out. */
  count: number;
  /** Station after the first time; empty at an angle that is none. */
  station: string;
  /** Path of the first time in the run, as the strip names it. */
  firstKey: string;
  /** Turntable angle when it begins the first time, deg. */
  fromDeg: number;
}

export interface Plan {
  timeline: Timeline;
  /** Length where every condition takes as long as it may, s; that of the timeline where none can. */
  mostS: number;
  strip: StripStep[];
  predicted: { x: number[]; y: number[] } | null;
  equilibrium: { x: number[]; y: number[] } | null;
  signal: PredictedSignal | null;
  /** Its relative standard uncertainty by what the rig document says; null where that says none. */
  signalU: ReturnType<typeof predictedSignalU>;
  /** Everything for which the protocol would be refused on this rig. */
  findings: Finding[];
  advice: Finding[];
  spans: ReadonlyMap<string, StepSpan>;
}

export interface PlanInput {
  document: ProtocolDocument;
  rig: RigDocument;
  timeZone: string;
  startUtcMs: number;
  /** What else is known; absent: nothing is said of it. */
  surroundings?: Surroundings;
  /** What `signalUOf` says of the rig: it takes some milliseconds and does not change with the draft. */
  signalU?: Plan['signalU'];
}

/** Points of a predicted curve: one for each pixel of a wide strip is plenty. */
const curvePoints = { full: 900, mini: 240 } as const;

const orNull = <T>(make: () => T): T | null => {
  try {
    return make();
  } catch {
    return null;
  }
};

/** The steps around a step, outermost first: `2.repeat.1.swing` stands in `2.repeat`. */
function* repeatsAround(documentPath: string): Generator<string> {
  const parts = documentPath.split('.');
  for (let length = 2; length < parts.length; length += 2) yield parts.slice(0, length).join('.');
}

function spansOf(items: readonly TimelineItem[]): Map<string, StepSpan> {
  const spans = new Map<string, StepSpan>();
  const begins = new Map<string, number>();
  for (const item of items) {
    const known = spans.get(item.documentPath);
    const begin = begins.get(item.documentPath) ?? item.startUtcMs;
    // Parts of a shaped swing or a kick are one step.
    const goesOn = item.part !== undefined && known !== undefined && !item.path.endsWith('.a');
    if (goesOn && known.count === 1) Object.assign(known, { durationS: (item.endUtcMs - begin) / 1000, station: item.station });
    else if (known !== undefined && !goesOn) known.count += 1;
    else if (known === undefined) {
      begins.set(item.documentPath, item.startUtcMs);
      spans.set(item.documentPath, {
        durationS: (item.endUtcMs - item.startUtcMs) / 1000,
        count: 1,
        station: item.station,
        firstKey: item.path,
        fromDeg: item.angleFromDeg,
      });
    }
    for (const repeat of repeatsAround(item.documentPath)) {
      const first = begins.get(repeat) ?? item.startUtcMs;
      begins.set(repeat, first);
      spans.set(repeat, {
        durationS: (item.endUtcMs - first) / 1000,
        count: 1,
        station: item.station,
        firstKey: spans.get(repeat)?.firstKey ?? item.path,
        fromDeg: spans.get(repeat)?.fromDeg ?? item.angleFromDeg,
      });
    }
  }
  return spans;
}

function timelineOf({ document, rig, timeZone, startUtcMs }: PlanInput, conditions: 'expected' | 'most' = 'expected'): Timeline {
  return planTimeline({ protocol: document, rig, timeZone, conditions }, { utcMs: startUtcMs, angleDeg: rig.motion?.homeDeg ?? 0 });
}

/** Relative standard uncertainty of the predicted near minus far; null where the rig document tells none. */
export const signalUOf = (rig: RigDocument): Plan['signalU'] => orNull(() => predictedSignalU(rig));

/** Everything the editor shows of a draft. Never throws: what cannot be told of a draft is left out. */
export function makePlan(input: PlanInput): Plan {
  const { document, rig, timeZone, startUtcMs, surroundings } = input;
  const timeline = timelineOf(input);
  const curve = orNull(() => predictDeflection(rig, timeline, curvePoints.full));
  const start = { utcMs: startUtcMs, angleDeg: rig.motion?.homeDeg ?? 0, timeZone, ...surroundings };
  return {
    timeline,
    mostS: timelineOf(input, 'most').durationS,
    strip: stepsOfPlan(timeline.items),
    predicted: curve === null ? null : { x: curve.utcMs, y: curve.rad },
    equilibrium: curve === null ? null : { x: curve.utcMs, y: curve.equilibriumRad },
    signal: orNull(() => predictSignal(rig)),
    signalU: input.signalU ?? null,
    findings: checkProtocol(document, rig),
    advice: orNull(() => adviseProtocol(document, rig, start)) ?? [],
    spans: spansOf(timeline.items),
  };
}

/** Only what a miniature in a list shows. */
export function makeMiniature(input: PlanInput): Pick<Plan, 'strip' | 'predicted' | 'timeline'> {
  const timeline = timelineOf(input);
  const curve = orNull(() => predictDeflection(input.rig, timeline, curvePoints.mini));
  return { timeline, strip: stepsOfPlan(timeline.items), predicted: curve === null ? null : { x: curve.utcMs, y: curve.rad } };
}
