import { decodeLine, encode, FLAG, NO_SESSION, PROTOCOL_VERSION, type Item } from '@/firmware-protocol/codec';
import { RealClock } from '@/server/boot/real-clock';
import type { ByteLine } from '@/server/interfaces/byte-line';
import type { ControllerLimits } from '@/server/interfaces/turntable-link';
import { degOfSteps } from '@/server/links/rig-units';
import { serialFactory } from '@/server/links/serial-line';
import { SimulatedLine } from '@/server/links/simulated-line';
import { benchRig, type LinkBench } from './bench';
import { sleep } from '@/scripts/soak/board/controller-process';
import { LinkWatch } from './link-watch';

const BAUD_RATE = 115_200;
const BYTE_MS = 10_000 / BAUD_RATE;
/** Many boards restart when their port is opened; SPEC 13 gives them a second for it, their boot loader another. */
const START_MS = 2_500;
const ANSWER_MS = 2_000;
/** A person walks to the board and presses something. */
const HANDS_MS = 120_000;
/** The warning of 10 s and the whole travel at home speed, twice. */
const HOMING_MS = 100_000;

/**
 * A real controller on a real port. The port stays open for the whole suite, because opening it restarts many boards; links reach it
 * through a line in front of it on which bytes can be lost and spoilt, and which can vanish. Where a hand is needed, a person is asked.
 */
export class HardwareBench {
  private readonly clock = new RealClock();
  private readonly front: SimulatedLine;
  private port: ByteLine | null = null;
  private readonly heard: Item[] = [];
  private position: { atUs: number; steps: number | null } = { atUs: 0, steps: null };
  private flags = 0;
  private starts = 0;
  /** Highest epoch that the board has met. */
  private epoch = 0;

  constructor(private readonly path: string) {
    this.front = new SimulatedLine({
      clock: this.clock,
      seed: 1,
      byteMs: BYTE_MS,
      spendsByteTimes: false,
      description: path,
      toController: (line) => this.port?.write(`${line}\n`),
    });
  }

  async make(): Promise<LinkBench> {
    if (this.port === null) await this.begin();
    const bench = this.bench();
    await this.makeReady(bench);
    return bench;
  }

  async dispose(): Promise<void> {
    await this.port?.close();
  }

  private async begin(): Promise<void> {
    const factory = serialFactory({ path: this.path, baudRate: BAUD_RATE }, this.clock);
    this.port = await factory.open({
      onLine: (line) => this.hear(line),
      onClosed: (why) => {
        throw new Error(`${this.path}: ${why}`);
      },
    });
    await sleep(START_MS);
    const hello = encode({ kind: 'request', epoch: 0, session: NO_SESSION, number: 1, order: { word: 'hello', ...PROTOCOL_VERSION } });
    this.port.write(`\n${hello}`);
    const answer = () => this.heard.findLast((item) => item.kind === 'reply');
    await this.until(`answer from a controller at ${this.path}`, () => answer() !== undefined, ANSWER_MS);
    const { body } = answer() as Extract<Item, { kind: 'reply' }>;
    this.epoch = Math.max(1, body.word === 'no' && body.code === 'epoch' ? body.detail : 0);
  }

  /** Taught the limits of the bench's rig, homed, the warning over. */
  private async makeReady(bench: LinkBench): Promise<void> {
    const watch = new LinkWatch(bench, this.epoch);
    await watch.ready();
    const { minDeg, maxDeg, maxSpeed_deg_s, maxAcceleration_deg_s2, homeSpeed_deg_s = 0 } = benchRig;
    const limits: ControllerLimits = {
      leastDeg: minDeg,
      greatestDeg: maxDeg,
      maxSpeedDegS: maxSpeed_deg_s,
      maxAccelerationDegS2: maxAcceleration_deg_s2,
      homeSpeedDegS: homeSpeed_deg_s,
    };
    if (JSON.stringify(watch.link.limits()) !== JSON.stringify(limits)) {
      const outcome = await watch.link.teach(limits);
      if (!outcome.taught) throw new Error(`the controller at ${this.path} was not taught the bench's limits: ${outcome.message}`);
    }
    const { positionKnown, warningDue } = watch.link.controller() ?? {};
    if (positionKnown !== true || warningDue === true) {
      const id = watch.send((command) => ({ kind: 'home', id: command }));
      await watch.get('homed', { of: id, withinMs: HOMING_MS });
    }
    await watch.link.close();
  }

  private bench(): LinkBench {
    const { clock, front } = this;
    return {
      clock,
      epoch: this.epoch,
      factory: front.factory,
      until: (what, met, withinMs) => this.until(what, met, 2 * withinMs),
      pass: sleep,
      // What it counted: of the true angle only the home edge tells.
      trueAngleDeg: async () => degOfSteps(benchRig, this.position.steps ?? NaN),
      reset: () => {
        const before = this.starts;
        return this.byHand('press the reset button of the board', () => this.starts > before);
      },
      drop: async (ms) => front.drop(ms),
      garbage: async (ms) => front.garble(ms),
      interlock: (level) =>
        this.byHand(`${level === 'open' ? 'open' : 'close'} the interlock`, () => this.has(FLAG.interlockClosed) === (level === 'closed')),
      armKey: (level) => this.byHand(`turn the arm key ${level}`, () => this.has(FLAG.armKey) === (level === 'on')),
      unplug: async () => front.setMissing(true),
      plug: async () => front.setMissing(false),
      dispose: async () => undefined,
    };
  }

  /** A stored reply that is sent again tells of an earlier time. */
  private stands(atUs: number, steps: number | null): void {
    if (atUs >= this.position.atUs) this.position = { atUs, steps };
  }

  private has(flag: number): boolean {
    return (this.flags & flag) !== 0;
  }

  private async byHand(deed: string, done: () => boolean): Promise<void> {
    if (done()) return;
    process.stderr.write(`\nPlease ${deed}.\n`);
    await this.until(`hand that would ${deed}`, done, HANDS_MS);
  }

  private async until(what: string, met: () => boolean, withinMs: number): Promise<void> {
    const giveUpMs = this.clock.monotonicMs() + withinMs;
    while (!met()) {
      if (this.clock.monotonicMs() > giveUpMs) throw new Error(`within ${withinMs} ms there was no ${what}`);
      await sleep(5);
    }
  }

  private hear(line: string): void {
    const item = decodeLine(line);
    this.heard.push(item);
    if (item.kind === 'reply' && item.body.word === 'ok') {
      this.flags = item.body.flags;
      this.stands(item.receivedUs, item.body.position);
    } else if (item.kind === 'event' && item.what.word === 'ended') this.stands(item.atUs, item.what.position);
    else if (item.kind === 'event' && item.what.word === 'boot') {
      this.starts += 1;
      this.position = { atUs: item.atUs, steps: null };
    }
    this.front.fromController(`${line}\n`, this.clock.monotonicMs());
  }
}
