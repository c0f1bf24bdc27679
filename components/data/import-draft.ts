import { importChoicesSchema, type ImportCheck, type ImportChoices, type ImportMapping } from '@/shared/contracts/data';
import type { ImportView, RememberedMapping } from '@/shared/contracts/import-files';
import { isTimeZone } from '@/shared/lib/is-time-zone';
import { fittingMapping, type MappingKey } from './remembered-mapping';

/** An import as the person fills it in: nothing typed is lost by an error or a new answer. Pure. */

/** Null: the file does not tell and the person has not said it yet. */
export type MappingDraft = {
  [K in Exclude<keyof ImportMapping, 'elapsedFrom' | 'timesWithoutZoneAreUtc' | 'timeZone' | 'encoding'>]: ImportMapping[K] | null;
} & {
  encoding: NonNullable<ImportMapping['encoding']>;
  elapsedFrom: string;
  /** The zone of times that name none, `UTC` or an IANA name; null while the file has such times and nobody has said so; empty where they are refused. */
  zone: string | null;
};

export interface ImportState {
  /** The import on the server once the file is there. */
  imported: ImportView | null;
  draft: MappingDraft | null;
  /** What the file left open; marked on the form until it is stated. */
  ambiguous: readonly MappingKey[];
  /** The mapping was filled in as it was for this file. */
  remembered: RememberedMapping | null;
  channelName: string;
  /** What becomes of whatever the check found; `refuse` where nothing was chosen yet. */
  choices: ImportChoices;
  /** The check of exactly the present mapping and name of the channel. */
  check: ImportCheck | null;
}

export type ImportAction =
  | { kind: 'received'; imported: ImportView; remembered: readonly RememberedMapping[] }
  | { kind: 'guessed' }
  | { kind: 'changed'; change: Partial<MappingDraft> }
  | { kind: 'named'; channelName: string }
  | { kind: 'settled'; choices: Partial<ImportChoices> }
  | { kind: 'checked'; check: ImportCheck }
  | { kind: 'another-file' };

export const noImport = (channelName: string): ImportState => ({
  imported: null,
  draft: null,
  ambiguous: [],
  remembered: null,
  channelName,
  choices: importChoicesSchema.parse({}),
  check: null,
});

export function importReducer(state: ImportState, action: ImportAction): ImportState {
  switch (action.kind) {
    case 'received':
      return received(state, action.imported, action.remembered);
    case 'guessed':
      return state.imported === null ? state : received(state, state.imported, []);
    case 'changed':
      return state.draft === null ? state : { ...state, draft: { ...state.draft, ...action.change }, check: null };
    case 'named':
      return { ...state, channelName: action.channelName, check: null };
    case 'settled':
      return { ...state, choices: { ...state.choices, ...action.choices } };
    case 'checked':
      return { ...state, check: action.check, choices: noImport('').choices };
    case 'another-file':
      return noImport(state.channelName);
  }
}

const fieldWords: Record<MappingKey, string> = {
  encoding: 'how the text is encoded',
  delimiter: 'what parts the columns',
  decimal: 'the decimal sign',
  headerRow: 'whether the first row holds names',
  timeColumn: 'the column of the time',
  timeFormat: 'how the time is written',
  elapsedFrom: 'when time 0 was',
  timesWithoutZoneAreUtc: 'which zone the times are in',
  timeZone: 'a time zone by its name, such as Europe/Oslo',
  valueColumn: 'the column of the deflection',
  unit: 'the unit of the deflection',
};

function received(state: ImportState, imported: ImportView, remembered: readonly RememberedMapping[]): ImportState {
  const preview = imported.preview;
  if (preview === null) return { ...state, imported, draft: null, check: null };
  const ambiguous = preview.ambiguous.filter((key): key is MappingKey => key in fieldWords);
  const columns = preview.columns.map((column) => column.name);
  const fits = fittingMapping(remembered, { columns, channelName: state.channelName });
  const guessed = draftOf(preview.mapping);
  const open = Object.fromEntries(
    ambiguous.filter((key) => key !== 'elapsedFrom').map((key) => [key === 'timesWithoutZoneAreUtc' ? 'zone' : key, null]),
  );
  const draft: MappingDraft = fits === null ? { ...guessed, ...open } : { ...draftOf(fits.mapping), encoding: guessed.encoding };
  return { ...state, imported, draft, ambiguous: fits === null ? ambiguous : [], remembered: fits, check: null };
}

function draftOf({ timesWithoutZoneAreUtc: utc, timeZone, ...mapping }: RememberedMapping['mapping']): MappingDraft {
  return { encoding: 'utf-8', ...mapping, elapsedFrom: '', zone: utc === true ? 'UTC' : (timeZone ?? '') };
}

/** ISO 8601 in UTC with Z, as the archive writes it. */
export const isInstant = (text: string): boolean =>
  /^\d{4}-\d\d-\d\dT\d\d:\d\d(:\d\d(\.\d+)?)?Z$/.test(text) && Number.isFinite(Date.parse(text));

/** The mapping once all is stated; before that, what is still missing, in words. */
export function completeMapping(draft: MappingDraft): { mapping: ImportMapping; missing: null } | { mapping: null; missing: string[] } {
  const { elapsedFrom, zone, encoding, ...rest } = draft;
  const missing = (Object.keys(rest) as (keyof typeof rest)[]).filter((key) => rest[key] === null).map((key) => fieldWords[key]);
  if (draft.timeFormat === 'elapsed-s' && !isInstant(elapsedFrom)) missing.push(fieldWords.elapsedFrom);
  const zoned = draft.timeFormat === 'iso';
  if (zoned && zone === null) missing.push(fieldWords.timesWithoutZoneAreUtc);
  else if (zoned && zone !== '' && zone !== 'UTC' && !isTimeZone(zone ?? '')) missing.push(fieldWords.timeZone);
  if (draft.timeColumn !== null && draft.timeColumn === draft.valueColumn) missing.push('two different columns for time and deflection');
  if (missing.length > 0) return { mapping: null, missing };
  const extra = {
    ...(draft.timeFormat === 'elapsed-s' ? { elapsedFrom } : {}),
    ...(encoding === 'utf-8' ? {} : { encoding }),
    ...(zoned && zone === 'UTC' ? { timesWithoutZoneAreUtc: true } : {}),
    ...(zoned && zone !== null && zone !== '' && zone !== 'UTC' ? { timeZone: zone } : {}),
  };
  return { mapping: { ...(rest as ImportMapping), ...extra }, missing: null };
}

/** What still stands against storing a file that was checked, in words; empty: nothing. */
export function undecided({ problemCount, findings }: ImportCheck, choices: ImportChoices): string[] {
  const { different, among, outOfReach } = findings;
  const left = outOfReach.leavable && choices.outOfReach === 'leave-out' ? outOfReach.rows : 0;
  return [
    ...(problemCount > left ? ['rows that cannot be read'] : []),
    ...(different > 0 && choices.sameInstant === 'refuse' ? ['which value counts at the same instant'] : []),
    ...(among.rows > 0 && choices.among === 'refuse' ? ['what becomes of rows among other samples'] : []),
  ];
}
