import { Fragment, type ReactNode } from 'react';
import { Pressable, View } from 'react-native';
import { Icon, Label, Num, Panel } from '@/components/ui';
import type { StepRowView } from '@/shared/contracts/runs';
import { AngleCell, InstantCell, OutcomeCell, TitleCell, type TimeBase } from './step-cells';
import type { TargetSource } from './run-words';

export interface StepListProps {
  rows: readonly StepRowView[];
  /** Of the run; null until it is there. */
  protocol: TargetSource | null;
  base: TimeBase;
  /** How much of the samples of a row is excluded. */
  excluded: (row: StepRowView) => string | null;
  /** How many notes there are to a row. */
  noted: (row: StepRowView) => number;
  /** What an open row shows. */
  details: (row: StepRowView) => ReactNode;
  /** Seq of the row that is open. */
  open: number | null;
  onOpen: (seq: number | null) => void;
}

const head = 'py-2 pr-4 text-left font-sans text-13 font-regular text-dim';
const cell = 'py-2.5 pr-4 align-top';

/** The step log as a table, for wide screens. */
export function StepTable({ rows, protocol, base, excluded, noted, details, open, onOpen }: StepListProps) {
  return (
    <table className="w-full border-collapse" data-testid="step-table">
      <thead>
        <tr className="border-b border-line">
          {['', 'Step', 'Start', 'End', 'Turntable', 'Outcome', 'More'].map((title) => (
            <th key={title} scope="col" className={head}>
              {title}
            </th>
          ))}
        </tr>
      </thead>
      <tbody>
        {rows.map((row) => (
          <Fragment key={row.seq}>
            <tr className={open === row.seq ? '' : 'border-b border-line'} data-testid="step-row">
              <td className={cell}>
                <Num size={13} tone="dim">
                  {row.seq}
                </Num>
              </td>
              <td className={cell}>
                <TitleCell row={row} protocol={protocol} />
              </td>
              <td className={cell}>
                <InstantCell plannedUtcMs={row.plannedStartUtcMs} actualUtcMs={row.startUtcMs} uS={row.uStartS} base={base} />
              </td>
              <td className={cell}>
                <InstantCell plannedUtcMs={row.plannedEndUtcMs} actualUtcMs={row.endUtcMs} uS={row.uEndS} base={base} />
              </td>
              <td className={cell}>
                <AngleCell row={row} />
              </td>
              <td className={cell}>
                <OutcomeCell row={row} excluded={excluded(row)} noted={noted(row)} />
              </td>
              <td className="align-top">
                <OpenButton seq={row.seq} open={open === row.seq} onOpen={onOpen} />
              </td>
            </tr>
            {open === row.seq ? (
              <tr className="border-b border-line">
                <td />
                <td colSpan={6} className="pb-4">
                  {details(row)}
                </td>
              </tr>
            ) : null}
          </Fragment>
        ))}
      </tbody>
    </table>
  );
}

/** The step log as cards, for phones. */
export function StepCards({ rows, protocol, base, excluded, noted, details, open, onOpen }: StepListProps) {
  return (
    <View className="gap-3" role="list">
      {rows.map((row) => (
        <Panel key={row.seq} className="gap-2 p-3" testID="step-row">
          <View role="listitem" className="gap-2">
            <View className="flex-row items-start justify-between gap-2">
              <View className="min-w-0 shrink grow flex-row gap-2">
                <Num size={13} tone="dim" className="w-7 pt-0.5">
                  {row.seq}
                </Num>
                <TitleCell row={row} protocol={protocol} />
              </View>
              <OutcomeCell row={row} excluded={excluded(row)} noted={noted(row)} />
            </View>
            <View className="gap-2 pl-9">
              <Instant name="start">
                <InstantCell plannedUtcMs={row.plannedStartUtcMs} actualUtcMs={row.startUtcMs} uS={row.uStartS} base={base} />
              </Instant>
              <Instant name="end">
                <InstantCell plannedUtcMs={row.plannedEndUtcMs} actualUtcMs={row.endUtcMs} uS={row.uEndS} base={base} />
              </Instant>
              <View className="flex-row items-center justify-between gap-2">
                <AngleCell row={row} />
                <OpenButton seq={row.seq} open={open === row.seq} onOpen={onOpen} />
              </View>
            </View>
            {open === row.seq ? details(row) : null}
          </View>
        </Panel>
      ))}
    </View>
  );
}

function Instant({ name, children }: { name: string; children: React.ReactNode }) {
  return (
    <View className="flex-row gap-3">
      <Label className="w-9 pt-0.5">{name}</Label>
      <View className="min-w-0 shrink">{children}</View>
    </View>
  );
}

function OpenButton({ seq, open, onOpen }: { seq: number; open: boolean; onOpen: (seq: number | null) => void }) {
  return (
    <Pressable
      role="button"
      aria-label={`${open ? 'Hide' : 'Show'} events, notes and exclusions of step ${seq}`}
      aria-expanded={open}
      onPress={() => onOpen(open ? null : seq)}
      className="min-h-target min-w-target items-center justify-center rounded-action hover:bg-panel2"
      testID={`events-${seq}`}
    >
      <Icon name={open ? 'up' : 'open'} size={18} tone="dim" />
    </Pressable>
  );
}
