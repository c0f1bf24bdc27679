import { useState } from 'react';
import { Pressable, View } from 'react-native';
import { useLab, useLabQuery, wordsOf } from '@/components/api';
import { Body, Button, Empty, Icon, Label, Loading, Num, Panel, ProblemNotice } from '@/components/ui';
import { listAudit, type AuditEntry } from '@/shared/contracts/audit';
import { formatClock, formatDay } from '@/shared/lib/format-time';
import { auditFacts, everything, kindWords } from './audit-words';

export interface AuditFilter {
  who: string;
  kind: string;
  /** Days of the lab's zone; empty: from the first, until now. */
  from: string;
  until: string;
}

/** Entries of the chain, newest first, a page at a time. */
export function AuditEntries({ filter, onAll }: { filter: AuditFilter; onAll: () => void }) {
  const [cursors, setCursors] = useState<readonly (string | undefined)[]>([undefined]);
  return (
    <Panel className="py-1" testID="audit-entries">
      {cursors.map((cursor, index) => (
        <Page
          key={cursor ?? 'first'}
          cursor={cursor}
          filter={filter}
          onAll={onAll}
          onMore={index === cursors.length - 1 ? (next) => setCursors([...cursors, next]) : null}
        />
      ))}
    </Panel>
  );
}

const asked = ({ who, kind, from, until }: AuditFilter) => ({
  ...(who === everything ? {} : { who }),
  ...(kind === everything ? {} : { kind }),
  ...(from === '' ? {} : { from }),
  ...(until === '' ? {} : { until }),
});

interface PageProps {
  cursor: string | undefined;
  filter: AuditFilter;
  onAll: () => void;
  onMore: ((next: string) => void) | null;
}

function Page({ cursor, filter, onAll, onMore }: PageProps) {
  const query = useLabQuery(listAudit, { query: { ...asked(filter), ...(cursor === undefined ? {} : { cursor }) } });
  const [open, setOpen] = useState<number | null>(null);
  if (query.isError) return <ProblemNotice title="The entries could not be read" {...wordsOf(query.error)} />;
  if (query.data === undefined) return <Loading label="Loading the entries" />;
  const { items, next } = query.data.data;
  if (items.length === 0 && cursor === undefined)
    return <Empty title="No entry like that" icon="filter" action={{ label: 'Show all entries', onPress: onAll }} />;
  return (
    <>
      <View role="list">
        {items.map((entry) => (
          <Entry key={entry.seq} entry={entry} open={open === entry.seq} onPress={() => setOpen(open === entry.seq ? null : entry.seq)} />
        ))}
      </View>
      {next === null || onMore === null ? null : (
        <Button kind="quiet" label="Earlier" onPress={() => onMore(next)} testID="audit-earlier" />
      )}
    </>
  );
}

/** One line on a wide screen, two on a phone; the whole of it when opened. */
function Entry({ entry, open, onPress }: { entry: AuditEntry; open: boolean; onPress: () => void }) {
  const { timeZone } = useLab();
  const at = Date.parse(entry.at);
  const facts = auditFacts(entry.data);
  return (
    <View role="listitem" className="border-b border-line last:border-b-0" testID="audit-entry">
      <Pressable
        role="button"
        aria-expanded={open}
        onPress={onPress}
        className="min-h-target flex-row items-start gap-3 py-2 hover:bg-panel2"
        testID={`audit-entry-${entry.seq}`}
      >
        <Num size={13} tone="dim" className="w-[48px] pt-0.5">
          {entry.seq}
        </Num>
        <View className="min-w-0 flex-1 gap-0.5 wide:flex-row wide:gap-4">
          <Num size={13} tone="dim" className="wide:w-[160px] wide:pt-0.5">
            {formatDay(at, timeZone)} {formatClock(at, { timeZone, precision: 'seconds' })}
          </Num>
          <View className="wide:w-[220px]">
            <Body strong>{kindWords(entry.kind)}</Body>
            <Label>{entry.who}</Label>
          </View>
          {facts === '' ? null : (
            <Label className="min-w-0 break-words wide:flex-1 wide:pt-0.5" numberOfLines={open ? 0 : 2}>
              {facts}
            </Label>
          )}
        </View>
        <Icon name={open ? 'up' : 'down'} size={16} tone="dim" />
      </Pressable>
      {open ? <Whole entry={entry} /> : null}
    </View>
  );
}

function Whole({ entry }: { entry: AuditEntry }) {
  return (
    <View className="gap-2 pb-3 pl-[60px]" testID="audit-whole">
      <Label>{entry.at} (UTC)</Label>
      <Num size={13} selectable style={{ whiteSpace: 'pre-wrap', wordBreak: 'break-word' } as object}>
        {JSON.stringify(entry.data, null, 2)}
      </Num>
      <Label>Hash</Label>
      <Num size={13} selectable style={{ wordBreak: 'break-all' } as object}>
        {entry.hash}
      </Num>
    </View>
  );
}
