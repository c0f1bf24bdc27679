import { mkdtempSync, readFileSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { benchRig } from '@/tests/contract/link/bench';
import { decodeLine, encode, FLAG, NO_SESSION, type Reply } from '@/firmware-protocol/codec';
import { BoardMemory } from '@/server/boot/board-memory';
import { newBoard } from '@/server/boot/board-setting';
import { RealClock } from '@/server/boot/real-clock';
import { commissionedSession } from '@/server/links/board/board-controller';
import type { BoardSession } from '@/server/links/board/board-session';
import { referenceFirmware } from '@/server/links/board/firmware-file';

/** The emulated board over a restart of the server: it goes on as it was, or as after power-on with what its EEPROM keeps. */

const folder = mkdtempSync(join(tmpdir(), 'evenfall-board-'));
afterAll(() => rmSync(folder, { recursive: true }));
const file = join(folder, 'rig.bin');
const clock = new RealClock();
const setting = { rig: benchRig, seed: 3, file };
const minute = 60_000;

function greeted(session: BoardSession) {
  const present = session.msAt(session.board.cycle);
  session.advance(present + 1100);
  const ask = (word: 'hello' | 'status' | 'limits', id: string) => {
    const order = word === 'hello' ? ({ word, major: 1, minor: 0 } as const) : ({ word } as const);
    const lines = session.write(
      encode({ kind: 'request', epoch: 9, session: id, number: word === 'limits' ? 2 : 1, order }),
      session.msAt(session.board.cycle),
    );
    return lines.map(({ text }) => decodeLine(text)).find((item): item is Reply => item.kind === 'reply')?.body;
  };
  const hi = ask('hello', NO_SESSION);
  const id = hi?.word === 'hi' ? hi.session : '';
  return { hi, status: ask('status', id), limits: ask('limits', id) };
}

function saved(agoMs: number): { memory: BoardMemory; boot: string } {
  const memory = new BoardMemory(file);
  const session = commissionedSession({ rig: benchRig, homed: true, startSteps: 1234 });
  memory.save({ atUtcMs: clock.utcMs() - agoMs, state: session.board.state() }, referenceFirmware());
  const { hi } = greeted(session);
  return { memory, boot: hi?.word === 'hi' ? hi.boot : '' };
}

test('a server that is back soon finds the same start of the board, its position and its table', () => {
  const { memory, boot } = saved(2 * minute);
  const { session, presentMs } = newBoard(setting, { clock, memory });
  expect(clock.monotonicMs() - presentMs).toBeGreaterThanOrEqual(2 * minute - 1);
  const { hi, status } = greeted(session);
  expect(hi).toMatchObject({ boot });
  expect(status).toMatchObject({ word: 'ok', state: 'rest', position: 1234 });
  expect(session.placeAt(Infinity)).toBe(1234);
});

test('one that was away for long finds a board that was switched off: position unknown, limits kept, table where it stood', () => {
  const { memory, boot } = saved(60 * minute);
  const { hi, status, limits } = greeted(newBoard(setting, { clock, memory }).session);
  expect(hi).not.toMatchObject({ boot });
  expect(status).toMatchObject({ word: 'ok', position: null });
  expect((status?.word === 'ok' ? status.flags : 0) & FLAG.positionKnown).toBe(0);
  expect(limits).toMatchObject({ word: 'lim', least: -17_000, greatest: 17_000 });
});

test('the first start has a board that knows the limits of its rig, and a file that is spoilt counts as none', () => {
  writeFileSync(file, readFileSync(file).subarray(0, 100));
  const { status, limits } = greeted(newBoard(setting, { clock, memory: new BoardMemory(file) }).session);
  expect(status).toMatchObject({ word: 'ok', position: null });
  expect(limits).toMatchObject({ word: 'lim', least: -17_000, greatest: 17_000 });
});
