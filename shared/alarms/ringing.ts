import { alarmKinds, type AlarmCode, type Ringing } from './catalog';

const nearEnoughMs = 3 * 3_600_000;

/** Whether a kind rings, where that depends on the night: a restart of the controller only while enough of it is left to save. */
export function ringingOf(code: AlarmCode, night: { leftMs: number | null; someoneNear: boolean }): Ringing {
  if (code !== 'controller-reset') return alarmKinds[code].rings;
  return night.leftMs !== null && night.leftMs > nearEnoughMs && night.someoneNear ? 'always' : 'morning';
}
