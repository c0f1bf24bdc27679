import { hex8, type Order, type Reply } from '@/firmware-protocol/codec';
import type { LinkCommand, MotionSent } from '../interfaces/turntable-link';
import type { CommandEffect, CommandInput, CommandLife, RequestClass } from './command-life';
import type { LiveRequest, SentAs } from './wire';

/** A command of the run engine on its way through the controller. */
export interface Command extends LiveRequest {
  readonly command: LinkCommand | MotionSent;
  /** SPEC 3.8. */
  readonly tag: string;
  /** While uncertain: once the events up to this number are read, it is clear whether it was accepted; null: not known yet. */
  resolvedBy: number | null;
  /** Another process sent it. */
  readonly takenUp: boolean;
}

export interface CommandBookSetting {
  compose(command: LinkCommand, tag: string): Order;
  told(command: Command, effect: CommandEffect, reply: Reply | null): void;
}

const HALF_RANGE = 0x8000;
const FNV_OFFSET = 0x811c9dc5;
const FNV_PRIME = 0x01000193;

/** The commands that are not over yet, in the order in which they came. */
export class CommandBook {
  private commands: Command[] = [];

  constructor(private readonly setting: CommandBookSetting) {}

  add(command: LinkCommand): Command {
    const { setting } = this;
    return this.enter(command, { life: { phase: 'queued' }, takenUp: false, compose: (tag) => setting.compose(command, tag) });
  }

  /** A motion that another process sent: it is never sent again, and the controller's events tell what became of it. */
  takeUp(motion: MotionSent): void {
    const compose = (): never => {
      throw new Error(`the motion ${motion.id} of another process is not to be sent`);
    };
    this.enter(motion, { life: { phase: 'uncertain' }, takenUp: true, compose });
  }

  /** The controller is at rest and all that it keeps is read: of what it has not told by now it knows nothing. */
  dropTakenUp(): void {
    this.commands = this.commands.filter(({ takenUp }) => !takenUp);
  }

  private enter(
    command: Command['command'],
    { life, takenUp, compose }: Pick<Command, 'life' | 'takenUp'> & { compose(tag: string): Order },
  ): Command {
    const { setting } = this;
    const tag = tagOf(command.id);
    const entry: Command = {
      command,
      tag,
      of: command.kind === 'hold' || command.kind === 'stop' ? 'stop' : 'motion',
      life,
      takenUp,
      sent: null,
      resolvedBy: null,
      compose: () => compose(tag),
      told: (effect, reply) => setting.told(entry, effect, reply),
    };
    this.commands.push(entry);
    return entry;
  }

  get length(): number {
    return this.commands.length;
  }

  remove(entry: Command): void {
    this.commands = this.commands.filter((other) => other !== entry);
  }

  byTag(tag: string): Command | undefined {
    return this.commands.find((entry) => entry.of === 'motion' && entry.tag === tag);
  }

  first(of: RequestClass, phase: CommandLife['phase']): Command | undefined {
    return this.commands.find((entry) => entry.of === of && entry.life.phase === phase);
  }

  /** Whether a motion was accepted and has not ended. */
  get motionGoing(): boolean {
    return this.first('motion', 'accepted') !== undefined || this.first('motion', 'moving') !== undefined;
  }

  each(deed: (entry: Command) => void): void {
    if (this.commands.length === 0) return;
    for (const entry of [...this.commands]) deed(entry);
    this.commands = this.commands.filter(({ life }) => life.phase !== 'over');
  }

  /** The controller answered a request: what was sent before it and is not accepted once the events up to `event` are read, never will be. */
  noteAnswered(answered: SentAs, event: number): void {
    for (const entry of this.commands) {
      if (entry.life.phase !== 'uncertain' || entry.resolvedBy !== null || entry.sent === null) continue;
      const ahead = (answered.number - entry.sent.number) & 0xffff;
      if (answered.session !== entry.sent.session || (ahead > 0 && ahead < HALF_RANGE)) entry.resolvedBy = event;
    }
  }

  /** Inputs for those commands whose fate is clear now. */
  resolved(hasGivenOn: (event: number) => boolean, input: (entry: Command, input: CommandInput) => void): void {
    this.each((entry) => {
      if (entry.life.phase === 'uncertain' && entry.resolvedBy !== null && hasGivenOn(entry.resolvedBy))
        input(entry, { kind: 'caught-up' });
    });
  }
}

/** A time of the host, which means nothing to the controller before its clock is known. */
export function isTimed(command: Command['command']): boolean {
  return 'startUtcMs' in command && command.startUtcMs !== null;
}

/** A command's id, of any form, as an identifier of the protocol (FNV-1a, 32 bit). */
export function tagOf(id: string): string {
  let hash = FNV_OFFSET;
  for (let index = 0; index < id.length; index += 1) hash = Math.imul(hash ^ id.charCodeAt(index), FNV_PRIME);
  return hex8(hash);
}
