import { RealClock } from '@/server/boot/real-clock';
import type { ByteLineFactory } from '@/server/interfaces/byte-line';
import { demoRigWide } from '@/shared/rig/demo-rigs';
import { benchRig, type BenchMaker, type LinkBench } from './bench';
import { ControllerProcess, sleep } from '@/scripts/soak/board/controller-process';

/** Controllers as processes in real time, behind pseudo-terminals; `factoryOn` says over what the link reaches them. */
export class ProcessBenches {
  readonly clock = new RealClock();
  private readonly started: ControllerProcess[] = [];
  /** A controller whose position is known still; starting one takes a second or two. */
  private kept: Promise<ControllerProcess> | null = null;

  constructor(private readonly factoryOn: (process: ControllerProcess, clock: RealClock) => ByteLineFactory | Promise<ByteLineFactory>) {}

  async start(...options: string[]): Promise<ControllerProcess> {
    const process = new ControllerProcess(options, { ...demoRigWide, stations: {}, motion: benchRig });
    this.started.push(process);
    await process.start();
    return process;
  }

  maker(name: string): BenchMaker {
    return {
      name,
      firmware: 'simulated',
      // Half of the round trip of a busy machine, and a wall clock read to 1 ms.
      beginToleranceS: 0.1,
      noiseMs: 400,
      make: async () => {
        this.kept ??= this.start('--homed', '--warned');
        return this.on(await this.kept);
      },
      makeStranger: async (kind) => this.on(await this.start(...(kind === 'babble' ? ['--babble'] : ['--protocol', '2.0']))),
      dispose: async () => {
        for (const process of this.started) await process.dispose();
      },
    };
  }

  async on(process: ControllerProcess): Promise<LinkBench> {
    const { clock } = this;
    const isKept = async () => (await this.kept) === process;
    const tell = async (words: string) => void (await process.tell(words));
    return {
      clock,
      factory: await this.factoryOn(process, clock),
      until: async (what, met, withinMs) => {
        const giveUpMs = clock.monotonicMs() + 2 * withinMs;
        while (!met()) {
          if (clock.monotonicMs() > giveUpMs) throw new Error(`within ${2 * withinMs} ms there was no ${what}`);
          await sleep(5);
        }
      },
      pass: sleep,
      trueAngleDeg: async () => (JSON.parse(await process.tell('angle')) as { angleDeg: number }).angleDeg,
      reset: async () => {
        if (await isKept()) this.kept = null;
        await tell('reset');
      },
      drop: (ms) => tell(`drop ${ms}`),
      garbage: (ms) => tell(`garbage ${ms}`),
      interlock: async (level) => {
        // Then it warns for 10 s before its next motion.
        if (await isKept()) this.kept = null;
        await tell(`interlock ${level}`);
      },
      armKey: (level) => tell(`key ${level}`),
      unplug: () => process.unplug(),
      plug: () => process.plug(),
      dispose: async () => {
        if (!(await isKept())) await process.dispose();
      },
    };
  }
}
