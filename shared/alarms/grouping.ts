import { alarmKinds, type AlarmCode } from './catalog';

/** Floods: what follows from something else does not ring beside it. */

export interface GroupMember {
  id: string;
  code: AlarmCode;
  /** Null: of the whole lab. */
  rigId: string | null;
  raisedUtcMs: number;
  /** The first cause it was put under; null where it is one itself. */
  causeId: string | null;
  standing: boolean;
}

/** A cause that is over still explains what comes so soon after it. */
const explainsMs = 10 * 60_000;
/** Ten alarms in ten minutes are more than anybody can heed (public texts on ISA-18.2). */
const flood = { count: 10, withinMs: 10 * 60_000 };

/**
 * The first cause of an alarm that is being raised among those before it; null where it is the first itself. In a flood everything that is
 * not for the safety of people goes under the first of the flood.
 */
export function firstCauseOf(raised: Omit<GroupMember, 'causeId' | 'standing'>, others: readonly GroupMember[]): string | null {
  const near = others.filter(({ id, rigId }) => id !== raised.id && (rigId === null || raised.rigId === null || rigId === raised.rigId));
  const explaining = near
    .filter(({ code, standing, raisedUtcMs }) => follows(raised.code, code) && (standing || raised.raisedUtcMs - raisedUtcMs <= explainsMs))
    .sort((one, other) => one.raisedUtcMs - other.raisedUtcMs)[0];
  if (explaining !== undefined) return explaining.causeId ?? explaining.id;
  if (alarmKinds[raised.code].rings === 'always') return null;
  const lately = others
    .filter(({ id, raisedUtcMs }) => id !== raised.id && raised.raisedUtcMs - raisedUtcMs <= flood.withinMs)
    .sort((one, other) => one.raisedUtcMs - other.raisedUtcMs);
  const [first] = lately;
  return first !== undefined && lately.length >= flood.count ? (first.causeId ?? first.id) : null;
}

/** Those that stand alone so far and turn out to follow from the alarm that is being raised. */
export function consequencesOf(
  raised: Pick<GroupMember, 'id' | 'code' | 'rigId' | 'raisedUtcMs'>,
  others: readonly GroupMember[],
): string[] {
  return others
    .filter(
      ({ id, code, rigId, causeId, raisedUtcMs }) =>
        id !== raised.id &&
        causeId === null &&
        (rigId === null || raised.rigId === null || rigId === raised.rigId) &&
        raised.raisedUtcMs - raisedUtcMs <= explainsMs &&
        follows(code, raised.code),
    )
    .map(({ id }) => id);
}

/** Directly, or by way of others. */
function follows(code: AlarmCode, from: AlarmCode): boolean {
  return alarmKinds[code].followsFrom.some((one) => one === from || follows(one as AlarmCode, from));
}
