import { moveKinds } from '../board/seeded-moves';
import { clockKinds } from '../clock/clock-kinds';
import { lineKinds } from '../fuzz/try-lines';
import { heartbeatKinds } from '../heartbeat/try-loss';
import { fileKinds } from '../import/try-file';
import { linkKinds, serialKinds } from '../link/try-night';
import { phoneKinds } from '../phone/try-phone';
import { nightKinds } from '../run/checks';
import type { SeededKinds } from './try-seeds';

/** By soak: all cases whose failing seeds are kept, and played again with every run of the tests. */
export const allKinds: Readonly<Record<string, SeededKinds>> = {
  link: linkKinds,
  pins: moveKinds,
  fuzz: lineKinds,
  r1: nightKinds,
  r2: serialKinds,
  r6: heartbeatKinds,
  r8: phoneKinds,
  r9: clockKinds,
  r10: fileKinds,
};
