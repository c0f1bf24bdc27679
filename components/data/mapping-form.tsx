import { View } from 'react-native';
import { Button, Field, Select } from '@/components/ui';
import { isTimeZone } from '@/shared/lib/is-time-zone';
import type { ImportMapping } from '@/shared/contracts/data';
import { isInstant, type MappingDraft } from './import-draft';
import type { MappingKey } from './remembered-mapping';

interface MappingFormProps {
  draft: MappingDraft;
  ambiguous: readonly MappingKey[];
  names: readonly string[];
  /** When the run started, ISO 8601; null before its start. */
  runStart: string | null;
  /** Of the lab. */
  timeZone: string;
  onChange: (change: Partial<MappingDraft>) => void;
}

const encodings: { value: NonNullable<ImportMapping['encoding']>; label: string }[] = [
  { value: 'utf-8', label: 'UTF-8' },
  { value: 'utf-16le', label: 'UTF-16, little-endian' },
  { value: 'utf-16be', label: 'UTF-16, big-endian' },
  { value: 'latin-1', label: 'Latin-1' },
];
const delimiters: { value: ImportMapping['delimiter']; label: string }[] = [
  { value: ',', label: 'comma' },
  { value: ';', label: 'semicolon' },
  { value: '\t', label: 'tab' },
  { value: '|', label: 'bar' },
  { value: ' ', label: 'space' },
];
const decimals: { value: ImportMapping['decimal']; label: string }[] = [
  { value: '.', label: 'point, 1.5' },
  { value: ',', label: 'comma, 1,5' },
];
const headers: { value: 'yes' | 'no'; label: string }[] = [
  { value: 'yes', label: 'names of the columns' },
  { value: 'no', label: 'data' },
];
const formats: { value: ImportMapping['timeFormat']; label: string }[] = [
  { value: 'iso', label: 'date and time, ISO 8601' },
  { value: 'epoch-s', label: 'seconds since 1970, UTC' },
  { value: 'epoch-ms', label: 'milliseconds since 1970, UTC' },
  { value: 'elapsed-s', label: 'seconds since a beginning' },
];
const units: { value: ImportMapping['unit']; label: string }[] = [
  { value: 'rad', label: 'rad, pendulum angle' },
  { value: 'mrad', label: 'mrad, pendulum angle' },
  { value: 'urad', label: 'µrad, pendulum angle' },
  { value: 'm', label: 'm, light spot on the scale' },
  { value: 'mm', label: 'mm, light spot on the scale' },
];

interface ChoiceProps<V extends string> {
  label: string;
  value: V | null;
  options: readonly { value: V; label: string }[];
  open: boolean;
  onChange: (value: V) => void;
  testID: string;
  /** What to say while it is not stated. */
  unstated?: string;
}

/** A choice that starts empty where the file does not tell: a guess that nobody looked at would be worse than none. */
function Choice<V extends string>({
  label,
  value,
  options,
  open,
  onChange,
  testID,
  unstated: missing = 'The file does not tell. Please state it.',
}: ChoiceProps<V>) {
  const unstated = { value: '' as V, label: 'choose…' };
  return (
    <View className="wide:w-[270px]">
      <Select
        label={label}
        value={value ?? ('' as V)}
        options={value === null ? [unstated, ...options] : options}
        onChange={(next) => (next === '' ? undefined : onChange(next))}
        testID={testID}
        hint={open && value !== null ? 'The file does not tell; you stated it.' : undefined}
        error={value === null ? missing : undefined}
      />
    </View>
  );
}

/** What times mean that name no zone. Of a local time that the clocks showed twice, or never, the check tells the row. */
function ZoneChoice({ zone, labZone, onChange }: { zone: string | null; labZone: string; onChange: (zone: string) => void }) {
  const listed = zone === null || zone === 'UTC' || zone === labZone;
  const options = [
    { value: 'UTC', label: 'UTC' },
    ...(labZone === 'UTC' ? [] : [{ value: labZone, label: `what clocks show in ${labZone}` }]),
    { value: 'other', label: 'what clocks show elsewhere' },
  ];
  return (
    <>
      <Choice
        label="Times without a zone are"
        value={listed ? zone : 'other'}
        options={options}
        open={false}
        onChange={(next) => onChange(next === 'other' ? ' ' : next)}
        testID="map-zone"
        unstated="The times name no zone. Please state it; no zone is guessed."
      />
      {listed ? null : (
        <View className="wide:w-[270px]">
          <Field
            label="Name of the zone"
            value={zone.trim()}
            onChange={(name) => onChange(name === '' ? ' ' : name)}
            placeholder="Europe/Oslo"
            testID="map-zone-name"
            error={zone.trim() === '' || isTimeZone(zone) ? undefined : 'Write it as Region/City, for example Europe/Oslo.'}
          />
        </View>
      )}
    </>
  );
}

/** How the file is to be read. */
export function MappingForm({ draft, ambiguous, names, runStart, timeZone, onChange }: MappingFormProps) {
  const columns = names.map((name, index) => ({ value: String(index), label: `${index + 1}: ${name}` }));
  const column = (index: number | null) => (index === null ? null : String(index));
  const open = (key: MappingKey) => ambiguous.includes(key);
  const signs =
    delimiters.some(({ value }) => value === draft.delimiter) || draft.delimiter === null
      ? delimiters
      : [...delimiters, { value: draft.delimiter, label: draft.delimiter }];
  return (
    <View className="gap-4 wide:flex-row wide:flex-wrap" testID="mapping-form">
      {draft.encoding === 'utf-8' ? null : (
        <Choice
          label="The text is encoded as"
          value={draft.encoding}
          options={encodings}
          open={false}
          onChange={(encoding) => onChange({ encoding })}
          testID="map-encoding"
        />
      )}
      <Choice
        label="Columns are parted by"
        value={draft.delimiter}
        options={signs}
        open={open('delimiter')}
        onChange={(delimiter) => onChange({ delimiter })}
        testID="map-delimiter"
      />
      <Choice
        label="Decimal sign"
        value={draft.decimal}
        options={decimals}
        open={open('decimal')}
        onChange={(decimal) => onChange({ decimal })}
        testID="map-decimal"
      />
      <Choice
        label="The first row holds"
        value={draft.headerRow === null ? null : draft.headerRow ? 'yes' : 'no'}
        options={headers}
        open={open('headerRow')}
        onChange={(answer) => onChange({ headerRow: answer === 'yes' })}
        testID="map-header"
      />
      <Choice
        label="Column of the time"
        value={column(draft.timeColumn)}
        options={columns}
        open={open('timeColumn')}
        onChange={(index) => onChange({ timeColumn: Number(index) })}
        testID="map-time"
      />
      <Choice
        label="Time is written as"
        value={draft.timeFormat}
        options={formats}
        open={open('timeFormat')}
        onChange={(timeFormat) => onChange({ timeFormat })}
        testID="map-format"
      />
      {draft.timeFormat === 'iso' && (draft.zone === null || draft.zone !== '' || open('timesWithoutZoneAreUtc')) ? (
        <ZoneChoice zone={draft.zone} labZone={timeZone} onChange={(zone) => onChange({ zone })} />
      ) : null}
      <Choice
        label="Column of the deflection"
        value={column(draft.valueColumn)}
        options={columns}
        open={open('valueColumn')}
        onChange={(index) => onChange({ valueColumn: Number(index) })}
        testID="map-value"
      />
      <Choice
        label="Unit of the deflection"
        value={draft.unit}
        options={units}
        open={open('unit')}
        onChange={(unit) => onChange({ unit })}
        testID="map-unit"
      />
      {draft.timeFormat === 'elapsed-s' ? (
        <View className="gap-2 wide:w-[560px]">
          <Field
            label="Time 0 was at (UTC)"
            value={draft.elapsedFrom}
            onChange={(elapsedFrom) => onChange({ elapsedFrom })}
            mono
            placeholder="2031-03-13T20:58:00.000Z"
            testID="map-elapsed"
            hint="By the clock of whatever wrote the file."
            error={
              draft.elapsedFrom === '' || isInstant(draft.elapsedFrom)
                ? undefined
                : 'Write it as 2031-03-13T20:58:00.000Z: date, T, time in UTC, Z.'
            }
          />
          {runStart === null ? null : (
            <Button
              kind="quiet"
              label="Time 0 was the start of the run"
              onPress={() => onChange({ elapsedFrom: runStart })}
              className="self-start"
            />
          )}
        </View>
      ) : null}
    </View>
  );
}
