import { Worker } from 'node:worker_threads';
import type { Logger } from 'pino';
import type { RigMotion } from '@/shared/rig/document';
import { controllerOn } from '../links/board/board-controller';
import type { BoardHost } from '../links/board/board-host';
import type { BoardDeed, BoardLine } from '../links/board/board-session';
import { StepTrack } from '../links/board/step-track';
import { stepsOfDeg } from '../links/rig-units';
import type { SimulatedController } from '../links/simulated-controller';
import type { BoardSetting } from './board-setting';
import type { FromBoard, ToBoard } from './board-messages';
import { factorOf, machineTimeOf, type MachineTime, type ThreadClock } from './machine-time';
import { threadOf } from './worker-tasks';

/** The emulated board in a worker thread, as the main thread holds it: what it does and what it says go through as messages. */
class WorkerBoardHost implements BoardHost {
  onLine: (line: BoardLine) => void = () => undefined;
  private readonly worker: Worker;
  private readonly time: MachineTime;
  private readonly track: StepTrack;

  constructor(
    private readonly clock: ThreadClock,
    setting: BoardSetting,
    onBroken: (error: Error) => void,
  ) {
    this.time = machineTimeOf(clock);
    this.track = new StepTrack(stepsOfDeg(setting.rig, setting.rig.homeDeg));
    this.worker = new Worker(threadOf('board-thread'), {
      eval: true,
      execArgv: [],
      workerData: { ...setting, factor: factorOf(clock) },
    });
    this.worker.unref();
    this.worker.on('message', (message: FromBoard) => this.heard(message));
    this.worker.on('error', onBroken);
  }

  write(bytes: string): void {
    this.send({ kind: 'write', bytes, atMs: this.time.toMachineMs(this.clock.monotonicMs()) });
  }

  do(deed: BoardDeed): void {
    this.send({ kind: 'do', deed });
  }

  placeAt(ms: number): number {
    return this.track.at(ms);
  }

  async end(): Promise<void> {
    await this.worker.terminate();
  }

  private send(message: ToBoard): void {
    this.worker.postMessage(message);
  }

  private heard(message: FromBoard): void {
    if (message.kind === 'lines') for (const { text, atMs } of message.lines) this.onLine({ text, atMs: this.time.fromMachineMs(atMs) });
    else for (const { time, place } of message.steps) this.track.add(this.time.fromMachineMs(time), place);
  }
}

/** The demo's turntable: the reference firmware on the emulated board, in a thread of its own. `end` takes the thread down. */
export function createWorkerBoard(
  setting: BoardSetting & { rig: RigMotion },
  { clock, log }: { clock: ThreadClock; log: Pick<Logger, 'error'> },
): { controller: SimulatedController; end(): Promise<void> } {
  const host = new WorkerBoardHost(clock, setting, (error) => log.error({ err: error }, 'the emulated board failed'));
  const { rig, seed } = setting;
  return { controller: controllerOn(host, { clock, rig, seed }), end: () => host.end() };
}
