import type { AlarmHistoryEntry, AlarmHopView, AlarmView } from '@/shared/contracts/alarms';
import { shownState } from '@/shared/alarms/machine';
import { kindOf, type AlarmRecord } from '../store/alarms';
import type { AlarmHistoryRow } from '../store/alarms-read';
import type { AlarmHopRow } from '../store/calls';
import { isoOf, isoOrNull } from './maker';

type Names = ReadonlyMap<string, string>;

export function alarmViewOf(alarm: AlarmRecord, rigNames: Names): AlarmView {
  const { title, cause, consequence, answer, answerWithinMin, priority, shelveAtMostMin } = kindOf(alarm.code);
  const { snapshot } = alarm;
  const { acknowledged, confirmed, shelf, outOfService } = snapshot;
  return {
    ...{ id: alarm.id, code: alarm.code, title, cause, consequence, answer, answerWithinMin, priority, shelveAtMostMin },
    ...{ rings: alarm.rings, state: shownState(snapshot), holds: snapshot.active, words: alarm.words, runId: alarm.runId },
    rigId: alarm.rigId,
    rigName: alarm.rigId === null ? null : (rigNames.get(alarm.rigId) ?? null),
    occurrence: snapshot.occurrence,
    raisedAt: isoOrNull(snapshot.raisedUtcMs),
    acknowledged: acknowledged === null ? null : { by: acknowledged.by, at: isoOf(acknowledged.utcMs) },
    confirmed: confirmed === null ? null : { by: confirmed.by, at: isoOf(confirmed.utcMs), note: confirmed.note },
    shelf: shelf === null ? null : { by: shelf.by, reason: shelf.reason, until: isoOf(shelf.untilUtcMs), oneShot: shelf.oneShot },
    suppressedWhy: snapshot.suppressedWhy,
    outOfService: outOfService === null ? null : { by: outOfService.by, at: isoOf(outOfService.utcMs), reason: outOfService.reason },
    causeId: alarm.causeId,
  };
}

export const historyViewOf = (row: AlarmHistoryRow & { code: string; rigId: string | null }, rigNames: Names): AlarmHistoryEntry => ({
  ...{ seq: row.seq, alarmId: row.alarmId, title: kindOf(row.code).title, fact: row.fact, by: row.by, words: row.words },
  rigName: row.rigId === null ? null : (rigNames.get(row.rigId) ?? null),
  at: isoOf(row.at),
});

export const hopViewOf = ({ seq, at, occurrence, name, means, outcome, detail }: AlarmHopRow): AlarmHopView => ({
  ...{ seq, occurrence, name, means, outcome, detail },
  at: isoOf(at),
});
