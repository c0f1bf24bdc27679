import { exclusionColumns } from './exclusions';
import { frameColumns } from './frames';
import { noteColumns } from './notes';
import type { ChannelInfo } from './run-records';
import { addedStepColumns, stepColumns } from './step-csv';

/** Frictionless Table Schemas of the archive's CSV files; units stand in the descriptions. */

export interface TableField {
  name: string;
  type: 'integer' | 'number' | 'string' | 'datetime' | 'boolean';
  format?: string;
  description: string;
  constraints?: { required: true };
}

export interface TableSchema {
  fields: TableField[];
  primaryKey?: string;
}

const instant = (name: string, description: string): TableField => ({
  name,
  type: 'datetime',
  format: '%Y-%m-%dT%H:%M:%S.%fZ',
  description: `${description}; UTC`,
});

const stepFields: Record<(typeof stepColumns | typeof addedStepColumns)[number], Omit<TableField, 'name'>> = {
  seq: { type: 'integer', description: 'number of the row, from 1', constraints: { required: true } },
  path: { type: 'string', description: 'path of the step in the protocol, 1-based, with pass numbers' },
  kind: { type: 'string', description: 'step kind of the protocol, or ring-down', constraints: { required: true } },
  label: { type: 'string', description: 'label of the step' },
  station: { type: 'string', description: 'station at which the step ends' },
  planned_start_utc: instant('', 'planned start as the plan stood when the step began'),
  planned_end_utc: instant('', 'planned end as the plan stood when the step began'),
  start_utc: { ...instant('', 'start'), constraints: { required: true } },
  end_utc: instant('', 'end'),
  u_start_s: { type: 'number', description: 'standard uncertainty of the start; unit: s' },
  u_end_s: { type: 'number', description: 'standard uncertainty of the end; unit: s' },
  angle_start_deg: { type: 'number', description: 'turntable angle at the start; unit: deg' },
  angle_end_deg: { type: 'number', description: 'turntable angle at the end; unit: deg' },
  outcome: { type: 'string', description: 'done, cut short, skipped, failed or late' },
  angle_source: { type: 'string', description: 'where the angle comes from: counted, edge-verified or encoder' },
  u_angle_deg: { type: 'number', description: 'standard uncertainty of the angle; unit: deg' },
  good: { type: 'boolean', description: 'whether a dwell is good; empty for other steps' },
};

export const stepsSchema: TableSchema = {
  fields: [...stepColumns, ...addedStepColumns].map((name) => ({ ...stepFields[name], name })),
  primaryKey: 'seq',
};

export function channelSchema(info: Pick<ChannelInfo, 'quantity' | 'unit' | 'calibration'>): TableSchema {
  const calibrated = info.calibration === undefined ? '' : '; as read, before offset + slope · value of the resource’s calibration';
  return {
    fields: [
      { ...instant('time_utc', 'middle of the exposure'), constraints: { required: true } },
      { name: 'value', type: 'number', description: `${info.quantity}; unit: ${info.unit}${calibrated}`, constraints: { required: true } },
    ],
    primaryKey: 'time_utc',
  };
}

const exclusionFields: Record<(typeof exclusionColumns)[number], TableField> = {
  start_utc: instant('start_utc', 'from this instant on samples are not used'),
  end_utc: instant('end_utc', 'up to this instant samples are not used'),
  reason: { name: 'reason', type: 'string', description: 'why' },
};

export const exclusionsSchema: TableSchema = { fields: exclusionColumns.map((name) => exclusionFields[name]) };

const noteFields: Record<(typeof noteColumns)[number], TableField> = {
  seq: { name: 'seq', type: 'integer', description: 'row of steps.csv that the note is about' },
  at_utc: instant('at_utc', 'when it was written'),
  by: { name: 'by', type: 'string', description: 'who wrote it' },
  text: { name: 'text', type: 'string', description: 'the note' },
};

export const notesSchema: TableSchema = { fields: noteColumns.map((name) => noteFields[name]) };

const frameFields: Record<(typeof frameColumns)[number], TableField> = {
  seq: { name: 'seq', type: 'integer', description: 'row of steps.csv that the frame belongs to' },
  moment: { name: 'moment', type: 'string', description: 'mark, swing-began or swing-ended' },
  at_utc: instant('at_utc', 'when that moment was'),
  camera: { name: 'camera', type: 'string', description: 'name of the camera' },
  taken_utc: instant('taken_utc', 'when the picture was taken; empty where there is none'),
  u_taken_s: { name: 'u_taken_s', type: 'number', description: 'standard uncertainty of that instant; unit: s' },
  path: { name: 'path', type: 'string', description: 'file of the archive; empty where there is none' },
  note: { name: 'note', type: 'string', description: 'why there is no picture' },
};

export const framesSchema: TableSchema = { fields: frameColumns.map((name) => frameFields[name]) };
