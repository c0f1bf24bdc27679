import type { LinkSettings } from '@/shared/contracts/rigs';
import type { RigDocument } from '@/shared/rig/document';
import type { ListedPort } from './serial-ports';
import type { TurntableLink } from './turntable-link';

/** What a rig is to this process: its open line, and for the simulated rig the pendulum behind it. */
export interface RigStation {
  labId: string;
  rigId: string;
  settings: LinkSettings;
  link: TurntableLink;
  /** Channel that the rig itself fills; null where data come from outside. */
  channel: { id: string; name: string; unit: string } | null;
  /** Arm key and door of a rig that is part of this server; null where they are real and turned at the rig. */
  virtual: VirtualInputs | null;
  /** How a rig that is part of this server truly stands now; null where it is real. */
  seen: (() => SeenRig) | null;
}

/** A rig as a camera above it would see it. */
export interface SeenRig {
  /** With the masses that lie on the turntable. */
  rig: RigDocument;
  /** Where the turntable truly stands, deg counter-clockwise from above. */
  angleDeg: number;
  doorClosed: boolean;
}

export interface VirtualInputs {
  turnKey(on: boolean): void;
  setDoor(closed: boolean): void;
}

export interface StationRig {
  labId: string;
  id: string;
  document: RigDocument;
  link: LinkSettings;
}

export interface LiveSampleBatch {
  rigId: string;
  channelId: string;
  channel: string;
  unit: string;
  rateHz: number;
  utcMs: Float64Array;
  value: Float64Array;
}

/** The rigs that this process drives. */
export interface RigStations {
  get(rigId: string): RigStation | null;
  /** Opens a rig's line, or opens it anew after its settings or its document changed; no run may be on it. */
  put(rig: StationRig): Promise<void>;
  /**
   * Takes a controller that obeys another server's number (SPEC 3.3) from it: this process's own number goes above it for good.
   * @returns the new number, or null where this process does not drive the rig
   */
  takeController(rig: { labId: string; rigId: string }, above: number): Promise<number | null>;
  /** Another mass set lies on the turntable from now on: only the simulated rig has to be told. */
  loadMasses(rigId: string, document: RigDocument): void;
  /** Serial ports of this computer, to choose from. */
  listPorts(): Promise<ListedPort[]>;
  /** Opens a line apart from the rig's own, says hello and tells what answered; nothing moves. Never rejects. */
  tryLine(rig: Pick<StationRig, 'document'>, settings: LinkSettings): Promise<{ ok: boolean; detail: string; firmware: string | null }>;
  onSamples(listener: (batch: LiveSampleBatch) => void): () => void;
}
