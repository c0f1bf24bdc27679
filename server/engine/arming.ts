import type { Cancel, Clock } from '../interfaces/clock';
import type { LinkEvent, TurntableLink } from '../interfaces/turntable-link';

/**
 * Arming happens at the rig: whoever asks for it turns the arm key on, leaves, and when the exit delay is over the door must be closed. A code
 * could be read out by telephone; a key, a delay and a closed door cannot.
 */

/** What is asked for: a person who answers for the rig on site until an instant. */
export interface ArmRequest {
  labId: string;
  rigId: string;
  rigName: string;
  name: string;
  note: string;
  untilUtcMs: number;
  /** Whose account asks. */
  by: { id: string; name: string };
}

/** `key-off`: the key is on from before and proves nobody's presence; `key-on`: it is to be turned on; `leave`: the exit delay goes on. */
export type ArmingStage = 'key-off' | 'key-on' | 'leave';

export interface ArmingNow {
  request: ArmRequest;
  stage: ArmingStage;
  /** When the key is awaited no longer, or the exit delay ends. */
  endsUtcMs: number;
}

export interface ArmingParts {
  clock: Clock;
  linkOf(rigId: string): TurntableLink | null;
  exitDelayMsOf(rigId: string): number;
  /** In a sentence, whose personal locks are on the rig; null while there are none. */
  lockedBy(rigId: string): string | null;
  /** Stores the arm; from then on it stands. */
  arm(request: ArmRequest, bootId: string): Promise<void>;
  /** Ends the arm that was just stored. */
  endArm(request: ArmRequest, why: string): void;
  /** It came to nothing: told, and entered into the audit chain. */
  notArmed(request: ArmRequest, why: string): void;
  onChange(rigId: string): void;
}

/** How long somebody may take to get to the key. */
const KEY_WAIT_MS = 600_000;

interface Open extends ArmingNow {
  /** Start of the controller at which the key was turned on; null before. */
  bootId: string | null;
  cancel: Cancel;
}

/** What of a link's events ends an arming, in words; null where it does not. */
function spoiltBy(event: LinkEvent, { stage }: ArmingNow): string | null {
  switch (event.kind) {
    case 'supply':
      return event.present ? null : 'the motor supply was lost';
    case 'reset':
      return 'the controller restarted';
    case 'lost':
    case 'refused-controller':
      return 'the line to the controller was lost, so nobody can say what happened at the rig';
    case 'arm-key':
      return stage === 'leave' && !event.on ? 'the arm key was turned off again' : null;
    default:
      return null;
  }
}

/** The armings that go on, at most one to a rig; in memory only: a server that restarts has armed nothing. */
export class Arming {
  private readonly going = new Map<string, Open>();

  constructor(private readonly parts: ArmingParts) {}

  of(rigId: string): ArmingNow | null {
    return this.going.get(rigId) ?? null;
  }

  /** Waits for the key. One that goes on already is replaced. */
  begin(request: ArmRequest): ArmingNow {
    const { clock, linkOf } = this.parts;
    this.going.get(request.rigId)?.cancel();
    const keyIsOn = linkOf(request.rigId)?.controller()?.armKey === true;
    const open: Open = {
      request,
      stage: keyIsOn ? 'key-off' : 'key-on',
      endsUtcMs: clock.utcMs() + KEY_WAIT_MS,
      bootId: null,
      cancel: clock.after(KEY_WAIT_MS, () => this.fail(open, 'the arm key was not turned on within 10 min')),
    };
    this.going.set(request.rigId, open);
    this.parts.onChange(request.rigId);
    return open;
  }

  /** What the link of a rig told. */
  heard(rigId: string, event: LinkEvent): void {
    const open = this.going.get(rigId);
    if (open === undefined) return;
    const why = spoiltBy(event, open);
    if (why !== null) return this.fail(open, why);
    if (event.kind !== 'arm-key') return;
    if (!event.on) open.stage = 'key-on';
    else if (open.stage === 'key-on') this.leave(open);
    this.parts.onChange(rigId);
  }

  /** Somebody ended it, or set a personal lock. */
  end(rigId: string, why: string): void {
    const open = this.going.get(rigId);
    if (open !== undefined) this.fail(open, why);
  }

  close(): void {
    for (const { cancel } of this.going.values()) cancel();
    this.going.clear();
  }

  private leave(open: Open): void {
    const { clock, exitDelayMsOf, linkOf } = this.parts;
    const { rigId } = open.request;
    const delayMs = exitDelayMsOf(rigId);
    open.cancel();
    open.stage = 'leave';
    open.endsUtcMs = clock.utcMs() + delayMs;
    open.bootId = linkOf(rigId)?.controller()?.bootId ?? null;
    open.cancel = clock.after(delayMs, () => void this.finish(open));
  }

  private async finish(open: Open): Promise<void> {
    const { rigId } = open.request;
    const why = this.whyNot(open);
    if (why !== null) return this.fail(open, why);
    try {
      await this.parts.arm(open.request, open.bootId ?? '');
    } catch {
      return this.fail(open, 'the database could not be reached to store it');
    }
    // What happened while it was being stored counts as well.
    const spoilt = this.going.get(rigId) === open ? this.whyNot(open) : 'it was ended before the exit delay was over';
    if (this.going.get(rigId) === open) this.going.delete(rigId);
    if (spoilt !== null) this.parts.endArm(open.request, spoilt);
    this.parts.onChange(rigId);
  }

  /** What must hold when the exit delay is over, in words where it does not. */
  private whyNot({ request, bootId }: Open): string | null {
    const { linkOf, lockedBy, clock } = this.parts;
    const link = linkOf(request.rigId);
    const controller = link?.controller() ?? null;
    if (link?.health().condition !== 'ready' || controller === null) return 'the controller did not answer when the exit delay was over';
    if (!controller.interlockClosed) return 'the door was not closed when the exit delay was over (the interlock was open)';
    if (!controller.supplyPresent) return 'the motor supply was off when the exit delay was over';
    if (!controller.armKey) return 'the arm key was off when the exit delay was over';
    if (controller.bootId !== bootId) return 'the controller restarted';
    if (request.untilUtcMs <= clock.utcMs()) return 'the end of the arm had passed before the exit delay was over';
    return lockedBy(request.rigId);
  }

  private fail(open: Open, why: string): void {
    const { rigId } = open.request;
    if (this.going.get(rigId) !== open) return;
    open.cancel();
    this.going.delete(rigId);
    this.parts.notArmed(open.request, why);
    this.parts.onChange(rigId);
  }
}
