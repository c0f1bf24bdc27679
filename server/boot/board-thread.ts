import { parentPort, workerData } from 'node:worker_threads';
import { LocalBoardHost } from '../links/board/board-host';
import { referenceFirmware } from '../links/board/firmware-file';
import type { FromBoard, ToBoard } from './board-messages';
import { BoardMemory } from './board-memory';
import { machineTimeOf, threadClock } from './machine-time';
import { newBoard, type BoardSetting } from './board-setting';

/** The emulated controller board in a thread of its own, in real time or `factor` times as fast. */

/** Runs the board until the thread is ended. */
function runBoard(
  { factor, ...setting }: BoardSetting & { factor: number },
  tell: (message: FromBoard) => void,
): (message: ToBoard) => void {
  const clock = threadClock(factor);
  const { toMachineMs, fromMachineMs } = machineTimeOf(clock);
  const memory = setting.file === null ? null : new BoardMemory(setting.file);
  const { session, presentMs } = newBoard(setting, { clock, memory });
  let toldSteps = 0;
  const host = new LocalBoardHost(clock, session, { presentMs, onPace: tellSteps });
  host.onLine = ({ text, atMs }) => tell({ kind: 'lines', lines: [{ text, atMs: toMachineMs(atMs) }] });
  tell({ kind: 'steps', steps: [{ time: -Infinity, place: session.placeAt(clock.monotonicMs()) }] });

  function tellSteps(): void {
    const { track } = session.board.table;
    if (track.count === toldSteps) return;
    const steps = track.after(toldSteps).map(({ time, place }) => ({ time: toMachineMs(session.msAt(time)), place }));
    tell({ kind: 'steps', steps });
    toldSteps = track.count;
  }

  /** Between deeds the board does what it must: they alone need keeping. */
  function save(): void {
    const { board } = session;
    const behindMs = clock.monotonicMs() - session.msAt(board.cycle);
    memory?.save({ atUtcMs: clock.utcMs() - behindMs, state: board.state() }, referenceFirmware());
  }

  return (message) => {
    if (message.kind === 'write') host.write(message.bytes, { atMs: fromMachineMs(message.atMs), beforeTelling: save });
    else host.do(message.deed, save);
  };
}

const port = parentPort;
if (port !== null) {
  const take = runBoard(workerData as BoardSetting & { factor: number }, (message) => port.postMessage(message));
  port.on('message', take);
}
