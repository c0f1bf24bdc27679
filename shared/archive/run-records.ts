import type { ProtocolDocument } from '../protocol/document';
import type { RigDocument } from '../rig/document';
import type { Calibration } from '../statistics/calibration';

/** The records a run leaves, as the engine writes them, the database keeps them and the archive shows them. */

/** Everything that was decided before the first motion. */
export interface RunStart {
  labId: string;
  runId: string;
  rigId: string;
  rigName: string;
  rigRevision: number;
  protocolName: string;
  protocolRevision: number;
  rig: RigDocument;
  protocol: ProtocolDocument;
  massSetLabel: string;
  /** IANA zone of the lab; times of day in a protocol are meant in it. */
  timeZone: string;
  operator: string;
  notes: string;
  /** The arm that allowed the start; null in a rehearsal, which counts as armed. */
  arm: { name: string; untilUtcMs: number } | null;
  /** From which the order of shuffled repeats is drawn; absent where the protocol has none. */
  shuffleSeed?: number;
  /** A rehearsal's recipe; null for a run on a rig. */
  simulated: SimulatedRun | null;
}

export interface SimulatedRun {
  /** G that the simulated balance obeys, m3 kg-1 s-2. */
  trueG: number;
  seed: number;
  rateHz: number;
  faults: { kind: string; atS: number }[];
  /** The simulated rig differs from its document by what the document's uncertainties admit, drawn from the seed. */
  drawGeometry?: true;
}

export type StepRowKind = 'home' | 'swing' | 'dwell' | 'kick' | 'ring-down' | 'settle' | 'wait' | 'proof' | 'mark' | 'prompt' | 'rotate';

export type StepOutcome = 'done' | 'cut short' | 'skipped' | 'failed' | 'late';

/** One row of the step log (steps.csv). Times are UTC ms; null while not yet known. */
export interface StepRow {
  seq: number;
  /** 1-based path with pass numbers, for example `2.repeat[3].1.swing`. */
  path: string;
  kind: StepRowKind;
  label: string;
  /** Station the sources stand at when the step ends; empty at an angle that is no station. */
  station: string;
  plannedStartUtcMs: number;
  plannedEndUtcMs: number | null;
  startUtcMs: number;
  endUtcMs: number | null;
  uStartS: number;
  uEndS: number | null;
  angleStartDeg: number | null;
  angleEndDeg: number | null;
  outcome: StepOutcome | null;
  angleSource: 'counted' | 'edge-verified' | 'encoder';
  uAngleDeg: number | null;
  /** For dwells only. */
  good: boolean | null;
}

/** One link of the event chain; hash = SHA-256 (hex) of the RFC 8785 canonical JSON of the object without `hash`. */
export interface ChainedEvent {
  seq: number;
  /** ISO 8601 UTC with milliseconds. */
  at: string;
  kind: string;
  data: Record<string, unknown>;
  prev: string;
  hash: string;
}

export interface ChannelInfo {
  name: string;
  quantity: string;
  unit: 'rad' | 'urad' | 'mrad' | 'm' | 'mm' | string;
  role: 'deflection' | 'environment' | 'turntable';
  /** What its samples truly say; absent: they say it themselves. */
  calibration?: ChannelCalibration;
}

/** A calibration in the channel's unit, and which revision of it. */
export interface ChannelCalibration extends Calibration {
  revision: number;
}

/** Samples of one channel, mid-exposure UTC ms and value in the channel's unit, in time order. */
export interface ChannelSeries {
  info: ChannelInfo;
  utcMs: Float64Array;
  value: Float64Array;
}
