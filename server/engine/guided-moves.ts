import type { Cancel, Clock } from '../interfaces/clock';
import type { ControllerLimits, LinkEvent, TeachOutcome, TurntableLink } from '../interfaces/turntable-link';
import { assertHoming, assertNudge, GuidedRefused, type GuidedRequest, type GuidedRig, type MoveRequest } from './guided-orders';
import { beginGuided, heardGuided, isUnderWay, withOrder, type GuidedState } from './guided-state';
import { homingLimitMs } from './homing-limit';
import type { Arm } from './run-context';
import { motionGraceMs } from './timing';

export interface GuidedParts {
  clock: Clock;
  linkOf(rigId: string): TurntableLink | null;
  armOf(rigId: string): Arm | null;
  /** In a sentence, the run that has the rig; null while it is free. */
  takenBy(rigId: string): string | null;
  /** In a sentence, whose personal locks are on the rig; null while there are none. */
  lockedBy(rigId: string): string | null;
  /** A stop voids the arm. */
  endArm(rig: { labId: string; rigId: string }, why: string, by: Person): void;
  onChange(rigId: string): void;
}

export interface Person {
  id: string;
  name: string;
}

/** A hold or stop by hand, apart from runs. */
export interface Halt {
  id: string;
  kind: 'hold' | 'stop';
  by: string;
  serverAtUtcMs: number;
  /** When the controller itself said that the turntable stands still; null until then. */
  confirmedAtUtcMs: number | null;
}

/** Who asks, in which session. */
export interface GuidedAsked {
  rigId: string;
  sessionId: string;
  userId: string;
}

/** One person at one page who moves one rig by small orders. */
export interface GuidedSession {
  id: string;
  rig: GuidedRig;
  by: Person;
  sinceUtcMs: number;
  state: GuidedState;
}

interface OpenSession extends GuidedSession {
  /** When the newest beat of the live stream was sent that the page has answered, by the server's monotonic clock, ms. */
  seenMs: number;
  orders: number;
  cancelWatch: Cancel;
  /** Homing that finds no edge is not let go on for ever. */
  cancelLimit: Cancel;
}

/** A page that has not answered the live stream for so long is taken for left: motion ends. */
export const ABSENT_MS = 2_000;
/** After so long the rig is free again. */
const GONE_MS = 30_000;

/**
 * Small moves by a person who stands at the rig, apart from runs: one session to a rig, only while no run has it. Every order needs
 * the arm, the arm key and the page itself, which answers the live stream; without an answer for 2 s the lease is renewed no more and a
 * hold is sent. Hold and stop need no session.
 */
export class GuidedMoves {
  private readonly sessions = new Map<string, OpenSession>();
  private readonly halts = new Map<string, Halt>();
  private haltCount = 0;

  constructor(private readonly parts: GuidedParts) {}

  /** @throws GuidedRefused */
  assertMayBegin(rig: GuidedRig): void {
    const other = this.sessions.get(rig.rigId);
    if (other !== undefined)
      throw new GuidedRefused('rig-busy', `${other.by.name} is at the guided first move of ${rig.name} already. Wait until it is ended.`);
    this.readyLink(rig);
  }

  /**
   * Takes the rig.
   * @throws GuidedRefused
   */
  begin(rig: GuidedRig, by: Person, id: string): GuidedSession {
    this.assertMayBegin(rig);
    const { clock } = this.parts;
    const session: OpenSession = {
      ...{ id, rig, by, sinceUtcMs: clock.utcMs(), seenMs: clock.monotonicMs() },
      state: beginGuided(),
      orders: 0,
      cancelWatch: () => undefined,
      cancelLimit: () => undefined,
    };
    this.sessions.set(rig.rigId, session);
    this.watch(session);
    this.parts.onChange(rig.rigId);
    return session;
  }

  of(rigId: string): GuidedSession | null {
    return this.sessions.get(rigId) ?? null;
  }

  haltOf(rigId: string): Halt | null {
    return this.halts.get(rigId) ?? null;
  }

  /** In a sentence, who holds the rig; null while nobody does. */
  takenBy(rigId: string): string | null {
    const session = this.sessions.get(rigId);
    return session === undefined
      ? null
      : `${session.by.name} is at the guided first move of ${session.rig.name}. It has to be ended on the link page first.`;
  }

  isPresent(rigId: string): boolean {
    const session = this.sessions.get(rigId);
    return session !== undefined && this.parts.clock.monotonicMs() - session.seenMs <= ABSENT_MS;
  }

  /** The page has the beat of the live stream that was sent at `beatMs` (monotonic). An old beat, or one that was never sent, says nothing. */
  seen(asked: GuidedAsked, beatMs: number): void {
    const session = this.sessionOf(asked);
    const nowMs = this.parts.clock.monotonicMs();
    if (beatMs > nowMs || nowMs - beatMs > ABSENT_MS || beatMs <= session.seenMs) return;
    session.seenMs = beatMs;
    this.watch(session);
  }

  /**
   * Why this order may not be given now; nothing is done.
   * @throws GuidedRefused
   */
  assertMayOrder(asked: GuidedAsked, order: GuidedRequest): GuidedSession {
    const session = this.sessionOf(asked);
    if (!this.isPresent(asked.rigId))
      throw new GuidedRefused(
        'not-possible-now',
        'This page has not answered the server for 2 s, so nothing is set in motion. Wait until it says live, then try again.',
      );
    const link = this.readyLink(session.rig);
    if (isUnderWay(session.state))
      throw new GuidedRefused('not-possible-now', 'The order before is still under way. Wait until the turntable stands still.');
    if (order.kind === 'nudge') assertNudge(session.rig.motion, link, order);
    if (order.kind === 'home') assertHoming(session.rig, link, order);
    return session;
  }

  /** In a sentence, why nothing may be ordered now; empty while something may. */
  whyNot(rigId: string): string {
    const session = this.sessions.get(rigId);
    if (session === undefined) return 'Nobody is at the guided first move.';
    try {
      this.assertMayOrder({ rigId, sessionId: session.id, userId: session.by.id }, { kind: 'teach' });
      return '';
    } catch (error) {
      if (error instanceof GuidedRefused) return error.message;
      throw error;
    }
  }

  /**
   * Writes limits to the controller, for good.
   * @throws GuidedRefused
   */
  teach(asked: GuidedAsked, limits: ControllerLimits): Promise<TeachOutcome> {
    const session = this.assertMayOrder(asked, { kind: 'teach' });
    return this.readyLink(session.rig).teach(limits);
  }

  /**
   * Sends the order to the controller.
   * @throws GuidedRefused
   */
  order(asked: GuidedAsked, order: MoveRequest): GuidedSession {
    this.assertMayOrder(asked, order);
    const session = this.sessions.get(asked.rigId) as OpenSession;
    const link = this.readyLink(session.rig);
    session.orders += 1;
    const id = `${session.id}-${String(session.orders)}`;
    const steps = order.kind === 'nudge' ? order.steps : null;
    session.state = withOrder(session.state, { id, sentAtUtcMs: this.parts.clock.utcMs(), kind: order.kind, steps });
    link.setLeaseRule(() => this.mayRenew(session));
    session.cancelLimit();
    if (order.kind === 'home') this.limitHoming(session);
    link.send(
      order.kind === 'home' ? { kind: 'home', id } : { kind: 'nudge', id, turnDeg: order.steps / session.rig.motion.stepsPerDegree },
    );
    this.parts.onChange(asked.rigId);
    return session;
  }

  /** Decelerates at once; a stop also voids the arm. Needs no session. Null where the rig has no line. */
  halt(rig: { labId: string; rigId: string }, kind: 'hold' | 'stop', by: Person): Halt | null {
    const link = this.parts.linkOf(rig.rigId);
    if (link === null) return null;
    const serverAtUtcMs = this.parts.clock.utcMs();
    this.haltCount += 1;
    const id = `${rig.rigId}-${kind}-${Math.round(serverAtUtcMs)}-${String(this.haltCount)}`;
    const halt: Halt = { id, kind, by: by.name, serverAtUtcMs, confirmedAtUtcMs: null };
    this.halts.set(rig.rigId, halt);
    // The link releases the drivers only where the rig is safe without them.
    link.send(kind === 'hold' ? { kind, id } : { kind, id, releaseDrivers: true });
    if (kind === 'stop') this.parts.endArm(rig, 'the turntable was stopped', by);
    this.parts.onChange(rig.rigId);
    return this.halts.get(rig.rigId) ?? halt;
  }

  /** What the link of a rig told. */
  heard(rigId: string, event: LinkEvent): void {
    const halt = this.halts.get(rigId);
    if (halt !== undefined && event.kind === 'standstill' && event.commandId === halt.id)
      this.halts.set(rigId, { ...halt, confirmedAtUtcMs: event.at.utcMs });
    const session = this.sessions.get(rigId);
    if (session !== undefined) session.state = heardGuided(session.state, event, session.rig.motion);
    this.parts.onChange(rigId);
  }

  /** The rig has a new revision: its line was opened anew. */
  revised(rigId: string, document: GuidedRig['document']): void {
    const session = this.sessions.get(rigId);
    const { motion } = document;
    if (session === undefined || motion === undefined) return;
    // Edge passes were counted in the steps of the revision before.
    session.rig = { ...session.rig, document, motion };
    session.state = { ...session.state, edges: [] };
    this.parts.onChange(rigId);
  }

  isMoving(rigId: string): boolean {
    const session = this.sessions.get(rigId);
    return session !== undefined && isUnderWay(session.state);
  }

  /** Gives the rig free; what still moves is held. Ending what has ended already changes nothing. */
  end(rigId: string, sessionId: string): void {
    const session = this.sessions.get(rigId);
    if (session?.id === sessionId) this.close(session);
  }

  /** Another process drives the rig now. */
  letGo(rigId: string): void {
    const session = this.sessions.get(rigId);
    if (session !== undefined) this.close(session);
  }

  closeAll(): void {
    for (const session of [...this.sessions.values()]) this.close(session);
  }

  private close(session: OpenSession): void {
    const { rigId } = session.rig;
    session.cancelWatch();
    session.cancelLimit();
    if (isUnderWay(session.state)) this.halt(session.rig, 'hold', session.by);
    this.sessions.delete(rigId);
    this.parts.linkOf(rigId)?.setLeaseRule(() => false);
    this.parts.onChange(rigId);
  }

  private sessionOf(asked: GuidedAsked): OpenSession {
    const session = this.sessions.get(asked.rigId);
    if (session?.id !== asked.sessionId)
      throw new GuidedRefused('not-possible-now', 'This guided first move has ended. Begin it again on the link page.');
    if (session.by.id !== asked.userId)
      throw new GuidedRefused(
        'rig-busy',
        `${session.by.name} is at the guided first move of ${session.rig.name}; only who began it moves the rig.`,
      );
    return session;
  }

  private mayRenew(session: OpenSession): boolean {
    const { rigId } = session.rig;
    return (
      this.sessions.get(rigId) === session &&
      isUnderWay(session.state) &&
      this.isPresent(rigId) &&
      this.parts.armOf(rigId) !== null &&
      this.parts.lockedBy(rigId) === null &&
      this.parts.takenBy(rigId) === null
    );
  }

  private limitHoming(session: OpenSession): void {
    const { rig, orders } = session;
    session.cancelLimit = this.parts.clock.after(homingLimitMs(rig.motion, null) + motionGraceMs(0), () => {
      const name = 'the server: the edge of the home flag was not found in the time that the whole way takes';
      if (session.orders === orders && isUnderWay(session.state)) this.halt(rig, 'hold', { id: '', name });
    });
  }

  /** Motion ends 2 s after the last answered beat, the session half a minute after it. */
  private watch(session: OpenSession): void {
    const { clock } = this.parts;
    const after = (ms: number, deed: () => void) => clock.after(Math.max(0, session.seenMs + ms - clock.monotonicMs()), deed);
    session.cancelWatch();
    session.cancelWatch = after(ABSENT_MS + 1, () => {
      if (isUnderWay(session.state)) this.halt(session.rig, 'hold', { id: '', name: 'the server: nobody was at the page for 2 s' });
      session.cancelWatch = after(GONE_MS, () => this.close(session));
    });
  }

  private readyLink(rig: GuidedRig): TurntableLink {
    const taken = this.parts.takenBy(rig.rigId);
    if (taken !== null) throw new GuidedRefused('rig-busy', taken);
    const lockedBy = this.parts.lockedBy(rig.rigId);
    if (lockedBy !== null) throw new GuidedRefused('locked', lockedBy);
    const link = this.parts.linkOf(rig.rigId);
    const health = link?.health();
    const controller = link?.controller() ?? null;
    if (link === null || health?.condition !== 'ready' || controller === null)
      throw new GuidedRefused('not-ready', `The controller of ${rig.name} does not answer. See to the link first.`);
    if (this.parts.armOf(rig.rigId) === null)
      throw new GuidedRefused('not-armed', `${rig.name} is not armed. A named person at the rig has to arm it first.`);
    if (!controller.armKey)
      throw new GuidedRefused('not-ready', 'The arm key on the controller is off. Turn it on at the rig; it says that somebody is there.');
    if (!controller.interlockClosed) throw new GuidedRefused('not-ready', 'The interlock is open. Close the guard or the door first.');
    if (!controller.supplyPresent) throw new GuidedRefused('not-ready', 'The motor supply is off. Switch it on at the rig first.');
    if (controller.moving && !this.isMoving(rig.rigId))
      throw new GuidedRefused('not-ready', 'The turntable is moving. Wait until it stands still.');
    return link;
  }
}
