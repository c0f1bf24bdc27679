import { Pressable, View } from 'react-native';
import { Body, Heading, Label, Num, Panel } from '@/components/ui';
import type { RigDocument } from '@/shared/rig/document';
import { documentRows, rowsByGroup, type DocumentRow } from './document-rows';
import { quantityLine, quantityWords } from './quantity-words';

interface DocumentListProps {
  document: RigDocument;
  /** Paths that differ from the saved revision. */
  changed?: readonly string[];
  onPress?: ((row: DocumentRow) => void) | undefined;
}

/** All quantities of a rig document, group by group. */
export function DocumentList({ document, changed = [], onPress }: DocumentListProps) {
  return (
    <View className="gap-4">
      {rowsByGroup(documentRows(document)).map(({ group, rows }) => (
        <Panel key={group} className="gap-0 pb-2">
          <Heading level={3} className="pb-1 text-dim">
            {group}
          </Heading>
          {rows.map((row, index) => (
            <RowLine
              key={row.path}
              row={row}
              first={index === 0}
              changed={changed.includes(row.path)}
              onPress={row.kind === 'words' ? undefined : onPress}
            />
          ))}
        </Panel>
      ))}
    </View>
  );
}

interface RowLineProps {
  row: DocumentRow;
  first: boolean;
  changed: boolean;
  onPress: ((row: DocumentRow) => void) | undefined;
}

function RowLine({ row, first, changed, onPress }: RowLineProps) {
  const { value, u, unit } = quantityWords(row);
  const line = `min-h-target flex-row items-center justify-between gap-3 py-1.5 ${first ? '' : 'border-t border-line'}`;
  const inside = (
    <>
      <Label className="min-w-0 flex-1">
        {row.label}
        {changed ? <Label tone="lamp"> (changed)</Label> : null}
      </Label>
      <View className="items-end">
        <Num size={15} className={row.kind === 'words' ? 'font-sans' : ''}>
          {value}
          {unit === '' ? '' : <Body className="font-sans">{unit === '°' ? '°' : ` ${unit}`}</Body>}
        </Num>
        {u === '' ? null : <Label className={u === 'exact' ? '' : 'font-mono tabular'}>{u}</Label>}
      </View>
    </>
  );
  if (onPress === undefined) return <View className={line}>{inside}</View>;
  return (
    <Pressable
      role="button"
      aria-label={`${row.group}, ${row.label}: ${quantityLine(row)}. Change`}
      onPress={() => onPress(row)}
      className={`${line} -mx-2 rounded-lg px-2 hover:bg-panel2`}
      testID={`row-${row.path}`}
    >
      {inside}
    </Pressable>
  );
}
