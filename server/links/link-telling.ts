import type { EventMessage, Reply } from '@/firmware-protocol/codec';
import type { RigMotion } from '@/shared/rig/document';
import type { Clock, Instant } from '../interfaces/clock';
import type { LinkEvent } from '../interfaces/turntable-link';
import type { ClockModel } from './clock-model';
import type { Command } from './command-book';
import type { CommandEffect } from './command-life';
import type { ControllerReport } from './controller-report';
import { END_CAUSE, HOMING_GAVE_UP, refusalMessage } from './link-words';

export interface TellingSetting {
  clock: Clock;
  model: ClockModel;
  report: ControllerReport;
  rig: RigMotion;
}

/** Uncertainty of instants that the server itself stamps, s: the length of one turn of its loop (an estimate, no source). */
const SERVER_U_S = 0.001;

/**
 * Turns what happens on the wire into the engine's events, with every controller time as UTC ± u. Events are kept back until `flush`,
 * so that a listener that sends a command at once finds the driver in order.
 */
export class LinkTelling {
  private readonly listeners = new Set<(event: LinkEvent) => void>();
  private waiting: LinkEvent[] = [];
  private flushing = false;

  constructor(private readonly setting: TellingSetting) {}

  subscribe(listener: (event: LinkEvent) => void): () => void {
    this.listeners.add(listener);
    return () => this.listeners.delete(listener);
  }

  tell(event: LinkEvent): void {
    this.waiting.push(event);
  }

  flush(): void {
    if (this.flushing) return;
    this.flushing = true;
    try {
      for (let event = this.waiting.shift(); event !== undefined; event = this.waiting.shift()) {
        for (const listener of this.listeners) listener(event);
      }
    } finally {
      this.flushing = false;
    }
  }

  now(): Instant {
    return { utcMs: this.setting.clock.utcMs(), uS: SERVER_U_S };
  }

  /** A controller time as UTC. */
  instant(us: number): Instant {
    const { clock, model } = this.setting;
    if (!model.known) return this.now();
    const { ms, uMs } = model.hostMsAt(us);
    return { utcMs: clock.utcMs() - clock.monotonicMs() + ms, uS: uMs / 1000 };
  }

  refused(commandId: string, code: string, message: string): void {
    this.tell({ kind: 'refused', at: this.now(), commandId, code, message });
  }

  /** What became of a command; `event` is the controller's event that brought it about, if any did. */
  command(entry: Command, effect: CommandEffect, { reply, event }: { reply: Reply | null; event: EventMessage | null }): void {
    const { report, rig } = this.setting;
    const commandId = entry.command.id;
    const at = event !== null ? this.instant(event.atUs) : reply !== null ? this.instant(reply.receivedUs) : this.now();
    const angleDeg = event !== null && 'position' in event.what ? report.angleOf(event.what.position) : null;
    switch (effect) {
      case 'accepted':
        return this.tell({ kind: 'accepted', at, commandId });
      case 'refused':
        if (reply?.body.word === 'no') this.refused(commandId, reply.body.code, refusalMessage(rig, reply.body, entry.command.kind));
        return;
      case 'not-delivered':
        return this.refused(
          commandId,
          'no-session',
          'the order never reached the controller, and no longer can: the line failed meanwhile',
        );
      case 'overtaken':
        return this.refused(commandId, 'overtaken', 'a hold or a stop went before this order');
      case 'began':
        return this.tell({ kind: 'motion-began', at, commandId, angleDeg });
      case 'ended':
        return this.ended(entry, event, at);
      case 'standstill':
        return this.tell({ kind: 'standstill', at: this.instant(report.upTo.atUs), commandId, angleDeg: report.angleDeg });
      case 'reset':
        return this.tell({ kind: 'motion-ended', at: this.now(), commandId, angleDeg: null, cause: 'reset' });
    }
  }

  private ended(entry: Command, event: EventMessage | null, at: Instant): void {
    if (event?.what.word !== 'ended') return;
    const { position, cause } = event.what;
    const commandId = entry.command.id;
    const angleDeg = this.setting.report.angleOf(position);
    if (cause === 'search') return this.tell({ kind: 'home-failed', at, commandId, message: HOMING_GAVE_UP });
    if (entry.command.kind === 'home' && cause === 'done' && angleDeg !== null)
      return this.tell({ kind: 'homed', at, commandId, angleDeg });
    this.tell({ kind: 'motion-ended', at, commandId, angleDeg, cause: END_CAUSE[cause] });
  }

  /** What the controller tells of itself, apart from commands. */
  happening({ atUs, what }: EventMessage): void {
    const at = this.instant(atUs);
    switch (what.word) {
      case 'edge':
        return this.tell({ kind: 'edge', at, angleDeg: this.setting.report.angleOf(what.position), direction: what.direction });
      case 'interlock':
        return this.tell({ kind: 'interlock', at, closed: what.closed });
      case 'supply':
        return this.tell({ kind: 'supply', at, present: what.present });
      case 'key':
        return this.tell({ kind: 'arm-key', at, on: what.on });
      case 'lease':
        return this.tell({ kind: 'lease-lapsed', at });
    }
  }
}
