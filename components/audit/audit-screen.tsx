import type { Href } from 'expo-router';
import { useState } from 'react';
import { View } from 'react-native';
import { useLab, useLabQuery, useMay, wordsOf } from '@/components/api';
import { Body, Button, Field, FilterGroup, Icon, Label, Loading, Num, Panel, ProblemNotice, Screen, Select } from '@/components/ui';
import { checkAudit, type AuditCheck } from '@/shared/contracts/audit';
import { formatClock, zoneName } from '@/shared/lib/format-time';
import { AuditEntries, type AuditFilter } from './audit-entries';
import { checkWords, everything, kindChoices, personChoices } from './audit-words';

const noFilter: AuditFilter = { who: everything, kind: everything, from: '', until: '' };

/** All that people did in the lab, for its owners: how far the chain of it is whole, and the entries by person, act and day. */
export function AuditScreen() {
  const { timeZone } = useLab();
  const mayRead = useMay('members.manage');
  const query = useLabQuery(checkAudit, { enabled: mayRead.ok });
  const [filter, setFilter] = useState(noFilter);
  const check = query.data?.data;
  return (
    <Screen title="Audit" back={{ href: '/lab' as Href, label: 'the lab' }} testID="audit-screen">
      {mayRead.ok ? (
        <>
          <Body tone="dim">What people did, entry by entry. Each entry holds the hash of the one before it, so that a change shows.</Body>
          {query.isError ? (
            <ProblemNotice title="The chain could not be followed" {...wordsOf(query.error)} />
          ) : check === undefined ? (
            <Loading label="Following the chain" />
          ) : (
            <Check check={check} timeZone={timeZone} busy={query.isFetching} onAgain={() => void query.refetch()} />
          )}
          <Filters filter={filter} people={check?.people ?? []} kinds={check?.kinds ?? []} onChange={setFilter} />
          <AuditEntries key={JSON.stringify(filter)} filter={filter} onAll={() => setFilter(noFilter)} />
          <Label>Times are those of {zoneName(timeZone)}.</Label>
        </>
      ) : (
        <Body>{mayRead.why}</Body>
      )}
    </Screen>
  );
}

interface CheckProps {
  check: AuditCheck;
  timeZone: string;
  busy: boolean;
  onAgain: () => void;
}

function Check({ check, timeZone, busy, onAgain }: CheckProps) {
  const { ok, head, more } = checkWords(check);
  return (
    <Panel edge={ok ? 'good' : 'danger'} className="gap-2" testID="audit-check">
      <View className="flex-row items-start gap-3" role={ok ? 'status' : 'alert'}>
        <Icon name={ok ? 'passed' : 'failed'} size={26} tone={ok ? 'good' : 'danger'} />
        <View className="min-w-0 flex-1">
          <Body size={17} strong>
            {head}
          </Body>
          <Body size={15}>{more}</Body>
        </View>
      </View>
      {check.hash === '' ? null : (
        <View>
          <Label>Hash of entry {check.upToSeq}:</Label>
          <Num size={13} selectable style={{ wordBreak: 'break-all' } as object}>
            {check.hash}
          </Num>
        </View>
      )}
      <View className="flex-row flex-wrap items-center justify-between gap-3">
        <Label className="shrink">
          Followed at {formatClock(Date.parse(check.checkedAt), { timeZone, precision: 'seconds' })} from the first entry on.
        </Label>
        <Button label="Follow it again" busy={busy} onPress={onAgain} testID="audit-again" />
      </View>
    </Panel>
  );
}

interface FiltersProps extends Pick<AuditCheck, 'people' | 'kinds'> {
  filter: AuditFilter;
  onChange: (filter: AuditFilter) => void;
}

function Filters({ filter, people, kinds, onChange }: FiltersProps) {
  const active = Object.entries(filter).some(([name, value]) => value !== noFilter[name as keyof AuditFilter]);
  const set = (change: Partial<AuditFilter>) => onChange({ ...filter, ...change });
  return (
    <FilterGroup label="Filter of the audit" active={active} testID="audit-filter">
      <View className="wide:w-[200px]">
        <Select label="Person" value={filter.who} options={personChoices(people)} onChange={(who) => set({ who })} testID="audit-who" />
      </View>
      <View className="wide:w-[240px]">
        <Select label="What" value={filter.kind} options={kindChoices(kinds)} onChange={(kind) => set({ kind })} testID="audit-kind" />
      </View>
      <View className="flex-row gap-3">
        <View className="min-w-0 flex-1 wide:w-[160px] wide:flex-none">
          <Field label="From" type="date" value={filter.from} onChange={(from) => set({ from })} testID="audit-from" />
        </View>
        <View className="min-w-0 flex-1 wide:w-[160px] wide:flex-none">
          <Field label="Until" type="date" value={filter.until} onChange={(until) => set({ until })} testID="audit-until" />
        </View>
      </View>
    </FilterGroup>
  );
}
