import type { RigDocument } from '@/shared/rig/document';

/** The rig document as a list of rows that people read, and changes to single rows. Pure. */

export interface QuantityRow {
  kind: 'quantity';
  value: number;
  /** Standard uncertainty, unit of the value. */
  u: number;
  unit: string;
}
interface PlainRow {
  kind: 'number';
  value: number;
  unit: string;
}
interface WordsRow {
  kind: 'words';
  words: string;
}
export type DocumentRow = { path: string; group: string; label: string } & (QuantityRow | PlainRow | WordsRow);

const groupNames: Record<string, string> = {
  pendulum: 'Pendulum',
  sources: 'Sources',
  stations: 'Stations',
  measured: 'Measured',
  lever: 'Light lever',
  readout: 'Readout',
  fibre: 'Fibre',
  axis: 'Axis',
  motion: 'Motion',
  noise: 'Noise of the simulated rig',
};

const labels: Record<string, string> = {
  'pendulum.arm': 'Arm, axis to ball centre',
  'pendulum.ballMass': 'Mass of a ball',
  'pendulum.ballRadius': 'Radius of a ball',
  'pendulum.beamMass': 'Mass of the beam',
  'pendulum.beamLength': 'Length of the beam',
  'pendulum.extraInertia': 'Further moment of inertia',
  'pendulum.balls': 'Balls',
  'pendulum.travel_rad': 'Free travel',
  'readout.range_rad': 'Range of the readout',
  'sources.shape': 'Shape',
  'sources.count': 'Number',
  'sources.mass': 'Mass of a source',
  'sources.radius': 'Radius of a source',
  'sources.height': 'Height of a source',
  'sources.orbit': 'Orbit, axis to source centre',
  'sources.offset': 'Height above the balls',
  'axis.offset': 'Turntable axis to fibre',
  'lever.distance': 'Mirror to scale',
  'lever.fold': 'Fold of the beam',
  'lever.sense': 'Sense',
  'lever.zero': 'Zero on the scale',
  'fibre.length': 'Length',
  'fibre.diameter': 'Diameter',
  'fibre.shearModulus': 'Shear modulus',
  'measured.period_s': 'Period, damped',
  'measured.decayTime_s': 'Decay time of the amplitude',
  'motion.stepsPerDegree': 'Steps to a degree',
  'motion.minDeg': 'Least angle',
  'motion.maxDeg': 'Greatest angle',
  'motion.maxSpeed_deg_s': 'Greatest speed',
  'motion.maxAcceleration_deg_s2': 'Greatest acceleration',
  'motion.homeDeg': 'Home edge',
  'motion.homeSpeed_deg_s': 'Speed of homing',
  'motion.backlash_deg': 'Backlash',
  'motion.turnsLimit': 'Whole turns allowed',
  'motion.safeWhenFree': 'Safe with drivers off',
  'noise.readout_rad': 'Readout, each sample',
  'noise.walk_rad_per_sqrt_min': 'Random walk',
  'noise.drift_rad_per_h': 'Drift',
  'noise.bursts_per_h': 'Bursts an hour',
  'noise.burst_rad': 'Size of a burst',
  'noise.burst_s': 'Length of a burst',
  'noise.temperature_K': 'Thermal noise at',
};

/** Units of the bare numbers, as their names carry them. */
const unitBySuffix: readonly (readonly [RegExp, string])[] = [
  [/_deg_s2$|AccelerationDegS2$/, '°/s²'],
  [/_deg_s$/, '°/s'],
  [/_rad_per_sqrt_min$/, 'rad/√min'],
  [/_rad_per_h$/, 'rad/h'],
  [/_rad$/, 'rad'],
  [/(_deg|Deg)$/, '°'],
  [/_per_h$/, '1/h'],
  [/_s$/, 's'],
  [/_K$/, 'K'],
  [/stepsPerDegree$/, '1/°'],
];

const unitOf = (path: string): string => unitBySuffix.find(([pattern]) => pattern.test(path))?.[1] ?? '';

type Value = Record<string, unknown>;
const isRecord = (value: unknown): value is Value => typeof value === 'object' && value !== null && !Array.isArray(value);
const isQuantity = (value: Value): value is Value & { value: number; u: number; unit: string } =>
  typeof value['value'] === 'number' && typeof value['u'] === 'number' && typeof value['unit'] === 'string';

function labelOf(path: string): string {
  const known = labels[path];
  if (known !== undefined) return known;
  const [group = '', name = '', field] = path.split('.');
  if (group === 'stations') return field === undefined ? name : `${name}, ${field}`;
  if (group === 'sources' && name === 'extra') return path.split('.').slice(2).join(' ');
  return path.split('.').slice(1).join(' ');
}

function wordsOf(value: unknown): string {
  if (typeof value === 'boolean') return value ? 'yes' : 'no';
  if (Array.isArray(value))
    return value.length === 0
      ? 'none'
      : value.map((each) => (Array.isArray(each) ? each.map((limit) => `${limit}°`).join(' to ') : String(each))).join(', ');
  return String(value);
}

function* walk(value: unknown, path: string): Generator<DocumentRow> {
  const group = groupNames[path.split('.')[0] ?? ''] ?? path;
  const head = { path, group, label: labelOf(path) };
  if (isRecord(value)) {
    if (isQuantity(value)) {
      yield { ...head, kind: 'quantity', value: value.value, u: value.u, unit: value.unit };
      if (typeof value['approach'] === 'string')
        yield {
          ...head,
          path: `${path}.approach`,
          label: `${head.label}, approached`,
          kind: 'words',
          words: value['approach'] === 'ccw' ? 'counter-clockwise' : 'clockwise',
        };
    } else for (const [name, inner] of Object.entries(value)) yield* walk(inner, path === '' ? name : `${path}.${name}`);
    return;
  }
  if (path === 'sources.extra' && Array.isArray(value)) {
    for (const [index, part] of value.entries()) yield* walk(part, `${path}.${index}`);
    return;
  }
  if (typeof value === 'number' && !['pendulum.balls', 'sources.count', 'lever.sense'].includes(path))
    yield { ...head, kind: 'number', value, unit: unitOf(path) };
  else yield { ...head, label: path === 'motion.keepOut' ? 'Keep-out arcs' : head.label, kind: 'words', words: wordsOf(value) };
}

/** All rows of a rig document in its own order. */
export const documentRows = (document: RigDocument): DocumentRow[] => [...walk(document, '')];

/** Rows by group, in order. */
export function rowsByGroup(rows: readonly DocumentRow[]): { group: string; rows: DocumentRow[] }[] {
  const groups = new Map<string, DocumentRow[]>();
  for (const row of rows) groups.set(row.group, [...(groups.get(row.group) ?? []), row]);
  return [...groups].map(([group, inGroup]) => ({ group, rows: inGroup }));
}

/** The document with other numbers at one place; all else is shared. */
export function withChange(document: RigDocument, path: string, change: { value: number; u?: number }): RigDocument {
  const set = (value: unknown, keys: readonly string[]): unknown => {
    const [key, ...rest] = keys;
    if (key === undefined) return isRecord(value) ? { ...value, value: change.value, u: change.u ?? value['u'] } : change.value;
    if (Array.isArray(value)) return value.map((each: unknown, index) => (String(index) === key ? set(each, rest) : each));
    return isRecord(value) ? { ...value, [key]: set(value[key], rest) } : value;
  };
  return set(document, path.split('.')) as RigDocument;
}

export interface DocumentChange {
  path: string;
  group: string;
  label: string;
  before: DocumentRow | null;
  after: DocumentRow | null;
}

const sameRow = (a: DocumentRow, b: DocumentRow) => JSON.stringify(a) === JSON.stringify(b);

/** What differs between two documents, row by row. */
export function documentChanges(before: RigDocument, after: RigDocument): DocumentChange[] {
  const old = new Map(documentRows(before).map((row) => [row.path, row]));
  const now = new Map(documentRows(after).map((row) => [row.path, row]));
  return [...new Set([...old.keys(), ...now.keys()])].flatMap((path) => {
    const [a, b] = [old.get(path) ?? null, now.get(path) ?? null];
    const shown = b ?? a;
    if (shown === null || (a !== null && b !== null && sameRow(a, b))) return [];
    return [{ path, group: shown.group, label: shown.label, before: a, after: b }];
  });
}
