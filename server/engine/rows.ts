import type { StepRow, StepRowKind } from '@/shared/archive/run-records';
import type { PlannedItem } from '@/shared/protocol/cursor';
import { countingToleranceDeg } from './counted-angle';
import type { Draft } from './draft';
import { angleFacts } from './position';

/** Rows of the step log as they begin. */

/** Nearer than this the sources stand where they should, deg. */
export const toleranceDeg = (draft: Draft): number => countingToleranceDeg(draft.start.rig);

export interface RowPlan {
  item: PlannedItem;
  station: string;
  endUtcMs: number | null;
}

/** A row that begins where and when the step before it ended. */
export function newRow(draft: Draft, { item, station, endUtcMs }: RowPlan): StepRow {
  const { moment } = draft.context;
  return {
    seq: 0,
    path: item.path,
    kind: item.part?.kind === 'ring-down' ? 'ring-down' : (item.step.kind as StepRowKind),
    label: item.step.label ?? '',
    station,
    plannedStartUtcMs: moment.utcMs,
    plannedEndUtcMs: endUtcMs,
    startUtcMs: moment.utcMs,
    endUtcMs: null,
    uStartS: moment.uS,
    uEndS: null,
    angleStartDeg: draft.controller.positionKnown ? moment.angleDeg : null,
    angleEndDeg: null,
    outcome: null,
    ...angleFacts(draft),
    good: null,
  };
}

/** The station at which the sources were brought to stand; a counted angle is off the station's by up to half a step. */
export function stationOf(draft: Draft): string {
  const { rig } = draft.start;
  const { moment, station = '' } = draft.context;
  const tolerance = toleranceDeg(draft);
  const standsAt = (name: string) => Math.abs((rig.stations[name]?.value ?? Number.NaN) - moment.angleDeg) <= tolerance;
  return standsAt(station) ? station : (Object.keys(rig.stations).find(standsAt) ?? '');
}
