import type { Sha256 } from '@/shared/archive/chain';
import type { RigMotion } from '@/shared/rig/document';
import type { ByteLineFactory } from '../../interfaces/byte-line';
import type { Clock } from '../../interfaces/clock';
import type { TurntableLink } from '../../interfaces/turntable-link';

/** The simulated controller, as far as a rehearsal handles it. */
export interface RehearsalController {
  factory: ByteLineFactory;
  /** deg, for past instants and the present. */
  trueAngleDegAt(utcMs: number): number;
  openInterlock(): void;
  closeInterlock(): void;
  reset(): void;
  dropLine(ms: number): void;
  garbage(ms: number): void;
}

/** What a rehearsal is plugged together from: the same link as a real rig, a simulated controller behind it. */
export interface RehearsalParts {
  sha256: Sha256;
  /** Resolves when all promises that are under way have done their work. */
  settle(): Promise<void>;
  createLink(options: { factory: ByteLineFactory; clock: Clock; rig: RigMotion; epoch: number }): TurntableLink;
  createController(options: { clock: Clock; rig: RigMotion; seed: number }): RehearsalController;
}
