import { uniformInt } from 'pure-rand/distribution/uniformInt';
import { xoroshiro128plus } from 'pure-rand/generator/xoroshiro128plus';
import { hex8 } from '@/firmware-protocol/codec';
import { sealed } from '@/scripts/soak/fuzz/almost-lines';
import { LEVEL } from './firmware-script';

/** What happens to a controller from outside, and when (ms from the beginning). */
export type Happening = { ms: number } & (
  { bytes: string } | { input: keyof typeof LEVEL; on: boolean } | { reset: 'button' | 'watchdog' }
);

const LIMITS = { least: -900, greatest: 900, speed: 400_000, acceleration: 400_000, home: 150_000 };
const WARNING_MS = 10_000;
/** So far from the beginning and the end of a motion nothing is done that would tell two honest controllers apart. */
const CLEAR_MS = 400;
const HOMING_MS = 30_000;
/** A start takes so long at most (SPEC 13); the clock begins after it. */
export const START_MS = 1000;

/**
 * A seeded conversation with a controller: motions, most of them disturbed, refused orders, repeated and old requests, garbage,
 * inputs, restarts. Each episode begins and ends at rest.
 */
export class Conversation {
  readonly happenings: Happening[] = [];
  private readonly random;
  private ms = 200;
  private sessions = 0;
  private boot = 1;
  private epoch = 5;
  private number = 0;
  private tag = 0;
  private lastLine = '';
  private place = 0;
  private warningDue = true;
  private homed = false;
  private started = 0;

  constructor(seed: number, episodes: number) {
    this.random = xoroshiro128plus(seed);
    this.hello();
    this.order(`teach ${LIMITS.least} ${LIMITS.greatest} ${LIMITS.speed} ${LIMITS.acceleration} ${LIMITS.home}`);
    this.ms += 300;
    for (let made = 0; made < episodes; made += 1) this.episode();
  }

  private upTo(last: number): number {
    return uniformInt(this.random, 0, last);
  }

  private pick<T>(list: readonly T[]): T {
    return list[this.upTo(list.length - 1)] as T;
  }

  private say(body: string): void {
    this.happenings.push({ ms: this.ms, bytes: sealed(body) });
    this.ms += 20;
  }

  private get session(): string {
    return hex8(((this.boot & 0xffff) << 16) | this.sessions);
  }

  private hello(): void {
    this.sessions += 1;
    this.number = 0;
    this.say(`q ${this.epoch} 00000000 ${this.upTo(65_535)} hello 1 0`);
  }

  private order(order: string): void {
    this.number = (this.number + 1 + this.upTo(3)) % 65_536;
    this.lastLine = `q ${this.epoch} ${this.session} ${this.number} ${order}`;
    this.say(this.lastLine);
  }

  private nextTag(): string {
    this.tag += 1;
    return hex8(this.tag);
  }

  private wait(ms: number, renewing = true): void {
    const until = this.ms + ms;
    while (renewing && this.ms + 950 < until) {
      this.order('renew');
      this.ms += 900;
    }
    this.ms = until;
  }

  private episode(): void {
    const kinds = ['move', 'move', 'move', 'timed', 'timed', 'nudge', 'refusals', 'refusals', 'fence', 'garbage', 'reset'] as const;
    const kind = this.homed ? this.pick(kinds) : this.pick(['home', 'home', 'home', 'nudge', 'refusals'] as const);
    this.order('renew');
    if (kind === 'home') this.home();
    else if (kind === 'move' || kind === 'timed') this.move(kind === 'timed');
    else if (kind === 'nudge') this.nudge();
    else if (kind === 'refusals') this.refusals();
    else if (kind === 'fence') this.fence();
    else if (kind === 'garbage') this.garbage();
    else this.reset();
    this.order('status');
    if (this.upTo(4) === 0) this.order(`events ${this.pick([0, 1, 2, 3, 5, 9, 4_294_967_295])}`);
  }

  private home(): void {
    this.order(`home ${this.nextTag()}`);
    this.wait((this.warningDue ? WARNING_MS : 0) + HOMING_MS);
    Object.assign(this, { warningDue: false, homed: true, place: 0 });
  }

  private nudge(): void {
    this.order(`nudge ${this.nextTag()} ${this.pick([-20, -7, 3, 50])}`);
    this.wait(WARNING_MS + 3000);
    this.warningDue = false;
    this.realign();
  }

  /** Both controllers stand where their own braking has led them: from here on at one place again. */
  private realign(): void {
    if (!this.homed) return;
    this.order(`move ${this.nextTag()} 0 ${LIMITS.speed} ${LIMITS.acceleration} now`);
    this.wait((this.warningDue ? WARNING_MS : 0) + 7000);
    this.warningDue = false;
    this.place = 0;
  }

  private move(timed: boolean): void {
    // A disturbed motion stays clear of the home edge: which step was the last one decides on which side of it the table stands.
    const disturbed = this.upTo(3) !== 0;
    if (disturbed && this.place < 0) this.realign();
    const position = uniformInt(this.random, disturbed ? 40 : LIMITS.least, LIMITS.greatest);
    const speed = uniformInt(this.random, 40_000, LIMITS.speed);
    const acceleration = uniformInt(this.random, 50_000, LIMITS.acceleration);
    const aheadMs = timed ? 1500 + this.upTo(40_000) : this.warningDue ? WARNING_MS : 0;
    const refused = timed && this.warningDue && aheadMs < WARNING_MS;
    const [v, a, size] = [speed / 1000, acceleration / 1000, Math.abs(position - this.place)];
    const lastsMs = Math.ceil(1000 * (size > (v * v) / a ? size / v + v / a : 2 * Math.sqrt(size / a)));
    const begin = timed ? this.stampAt(this.ms + aheadMs) : 'now';
    this.order(`move ${this.nextTag()} ${position} ${speed} ${acceleration} ${begin}`);
    if (refused) return;
    const whileWaiting = disturbed && aheadMs > 2 * CLEAR_MS + 200 && this.upTo(2) === 0;
    const whileMoving = disturbed && !whileWaiting && lastsMs > 4 * CLEAR_MS;
    if (whileWaiting) this.wait(CLEAR_MS + this.upTo(aheadMs - 2 * CLEAR_MS - 100));
    else this.wait(whileMoving ? aheadMs + CLEAR_MS + this.upTo(Math.floor(lastsMs / 2) - CLEAR_MS) : aheadMs + lastsMs + 2500);
    if (!whileWaiting) this.warningDue = false;
    this.place = position;
    if (whileWaiting || whileMoving) this.disturb(aheadMs + lastsMs + 3000);
  }

  /** A stamp counts from the last start. */
  private stampAt(ms: number): string {
    const us = Math.round((ms - this.started) * 1000);
    return `${String(1e9 + Math.floor(us / 1e6)).slice(1)}.${String(1e6 + (us % 1e6)).slice(1)}`;
  }

  private disturb(restMs: number): void {
    const kind = this.pick([
      'hold',
      'stop keep',
      'stop free',
      'off',
      'interlock',
      'supply',
      'hello',
      'epoch',
      'lapse',
      'key',
      'busy',
    ] as const);
    if (kind === 'interlock' || kind === 'supply' || kind === 'key') return this.flip(kind, restMs);
    if (kind === 'hello' || kind === 'epoch') {
      if (kind === 'epoch') this.epoch += 1;
      this.hello();
      this.order('status');
    } else if (kind === 'busy') {
      this.order(
        this.pick([`move ${this.nextTag()} 0 1000 1000 now`, `home ${this.nextTag()}`, 'teach -1 1 1 1 1', `nudge ${this.nextTag()} 1`]),
      );
    } else if (kind !== 'lapse') {
      this.say(
        `q ${this.pick([0, this.epoch])} ${this.pick(['00000000', this.session])} ${this.pick([0, this.number, (this.number + 1) % 65_536])} ${kind}`,
      );
      // Once more when both have come to rest: 400 microsteps/s at 50/s² take 8 s.
      this.ms += 9000;
      if (this.upTo(1) === 0) this.say(`q 0 00000000 0 ${kind}`);
    }
    this.wait(restMs, kind === 'hello' || kind === 'busy');
    this.order('status');
    this.hello();
    this.order('renew');
    if (kind === 'off' || kind === 'stop free') this.homed = false;
    this.realign();
  }

  private flip(input: keyof typeof LEVEL, restMs: number): void {
    this.happenings.push({ ms: this.ms, input, on: false });
    if (input === 'interlock') this.warningDue = true;
    if (input === 'supply') this.homed = false;
    this.wait(3000, input === 'key');
    this.order(`home ${this.nextTag()}`);
    if (input === 'key') this.order('teach -1 1 1 1 1');
    this.happenings.push({ ms: this.ms, input, on: true });
    this.wait(restMs + HOMING_MS);
    this.realign();
  }

  private refusals(): void {
    const orders = [
      `move ${hex8(this.tag)} 0 1000 1000 now`,
      `move ${this.nextTag()} ${LIMITS.greatest + 1} 1000 1000 now`,
      `move ${this.nextTag()} ${LIMITS.least - 5} 1000 1000 now`,
      `move ${this.nextTag()} 5 ${LIMITS.speed + 1} 1000 now`,
      `move ${this.nextTag()} 5 1000 ${LIMITS.acceleration + 1} now`,
      `move ${this.nextTag()} 5 1000 1000 ${this.stampAt(Math.max(this.started, this.ms - 5000))}`,
      `move ${this.nextTag()} 5 1000 1000 ${this.stampAt(this.ms + 61_000)}`,
      `move ${this.nextTag()} 5 1000 1000 999999999.999999`,
      'move',
      'moves',
      'home',
      'limits',
      'limits 1',
      'status now',
      `nudge ${this.nextTag()} 0`,
      `nudge ${this.nextTag()} 51`,
      'teach 5 5 1000 1000 1000',
      'teach -5 5 1000 1000 1001',
      'teach -5 5 8000001 1000 1000',
      'hello 1',
      'ident 0',
      'events -1',
      'warble',
    ];
    for (let count = 3; count > 0; count -= 1) this.order(this.pick(orders));
  }

  /** Sessions, numbers, epochs (SPEC 3). */
  private fence(): void {
    this.order('limits');
    this.say(this.lastLine);
    this.say(this.lastLine.replace('limits', 'status'));
    this.say(`q ${this.epoch} ${this.session} ${(this.number + 65_000) % 65_536} status`);
    this.say(`q ${this.epoch + 1} ${this.session} ${this.number + 1} renew`);
    this.say(`q ${this.epoch} 0000ABCD ${this.number + 1} renew`);
    this.say(`q ${this.epoch - 1} 00000000 3 hello 1 0`);
    this.say('q 0 00000000 0 ident');
    this.say(`q ${this.epoch} 00000000 1 renew`);
    this.order('hold');
    this.say(this.lastLine);
    this.say(`q ${this.epoch} ${this.session} ${this.number} stop keep`);
    this.hello();
  }

  private garbage(): void {
    const good = sealed(`q ${this.epoch} ${this.session} ${this.number + 1} move ${this.nextTag()} 50 100000 100000 now`);
    const at = this.upTo(good.length - 2);
    const pieces = [
      good.slice(0, at) + String.fromCharCode(good.charCodeAt(at) ^ (1 << this.upTo(6))) + good.slice(at + 1),
      good.slice(at + 1),
      `${'x'.repeat(97 + this.upTo(300))}\n`,
      '\n\r\n\n',
      sealed('r 00000000 1 000000000.000000 000000 no word 0'),
      sealed(`q ${this.epoch} ${this.session} 1`),
      `${good.slice(0, -1)} \n`,
      '\u0000\u00ff\n',
    ];
    for (let count = 4; count > 0; count -= 1) {
      this.happenings.push({ ms: this.ms, bytes: this.pick(pieces) });
      this.ms += 20;
    }
    this.happenings.push({ ms: this.ms, bytes: '\n' });
    this.ms += 20;
  }

  private reset(): void {
    this.happenings.push({ ms: this.ms, reset: this.pick(['button', 'watchdog'] as const) });
    this.started = this.ms + START_MS;
    this.ms += 2000;
    Object.assign(this, { warningDue: true, homed: false, sessions: 0, boot: this.boot + 1 });
    this.hello();
    this.order('renew');
  }
}
