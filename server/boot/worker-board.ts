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
import { machineAheadMs, type FromBoard, type ToBoard } from './board-messages';
import type { RealClock } from './real-clock';
import { threadOf } from './worker-tasks';

/** The emulated board in a worker thread, as the main thread holds it: what it does and what it says go through as messages. */
class WorkerBoardHost implements BoardHost {
  onLine: (line: BoardLine) => void = () => undefined;
  private readonly worker: Worker;
  private readonly aheadMs: number;
  private readonly track: StepTrack;

  constructor(
    private readonly clock: RealClock,
    setting: BoardSetting,
    onBroken: (error: Error) => void,
  ) {
    this.aheadMs = machineAheadMs(clock);
    this.track = new StepTrack(stepsOfDeg(setting.rig, setting.rig.homeDeg));
    this.worker = new Worker(threadOf('board-thread.ts'), { eval: true, execArgv: [], workerData: setting });
    this.worker.unref();
    this.worker.on('message', (message: FromBoard) => this.heard(message));
    this.worker.on('error', onBroken);
  }

  write(bytes: string): void {
    this.send({ kind: 'write', bytes, atMs: this.clock.monotonicMs() + this.aheadMs });
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
    if (message.kind === 'lines') for (const { text, atMs } of message.lines) this.onLine({ text, atMs: atMs - this.aheadMs });
    else for (const { time, place } of message.steps) this.track.add(time - this.aheadMs, place);
  }
}

/** The demo's turntable: the reference firmware on the emulated board, in a thread of its own. `end` takes the thread down. */
export function createWorkerBoard(
  setting: BoardSetting & { rig: RigMotion },
  { clock, log }: { clock: RealClock; log: Logger },
): { controller: SimulatedController; end(): Promise<void> } {
  const host = new WorkerBoardHost(clock, setting, (error) => log.error({ err: error }, 'the emulated board failed'));
  const { rig, seed } = setting;
  return { controller: controllerOn(host, { clock, rig, seed }), end: () => host.end() };
}
