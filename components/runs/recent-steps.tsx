import { Link, type Href } from 'expo-router';
import { memo } from 'react';
import { View } from 'react-native';
import { Body, Icon, Label, Num, Row, Section } from '@/components/ui';
import type { StepRowView } from '@/shared/contracts/runs';
import { formatTimeUncertainty } from '@/shared/lib/format-duration';
import { formatClock } from '@/shared/lib/format-time';
import { stepMark, stepTitle, type TargetSource } from './run-words';

interface RecentStepsProps {
  runId: string;
  protocol: TargetSource;
  rows: readonly StepRowView[];
  timeZone: string;
  count?: number;
}

/** The newest rows of the step log, and the way to all of it. */
export const RecentSteps = memo(function RecentSteps({ runId, protocol, rows, timeZone, count = 6 }: RecentStepsProps) {
  const newest = rows.slice(-count).reverse();
  return (
    <Section title="Step log" trailing={<TextLink href={`/runs/${runId}/log`} label="All steps" />}>
      <View>
        {newest.length === 0 ? <Label>Nothing yet.</Label> : null}
        {newest.map((row, index) => (
          <StepLine key={row.seq} row={row} title={stepTitle(row, protocol)} timeZone={timeZone} last={index === newest.length - 1} />
        ))}
      </View>
    </Section>
  );
});

function StepLine({ row, title, timeZone, last }: { row: StepRowView; title: string; timeZone: string; last: boolean }) {
  const mark = stepMark(row);
  const open = row.endUtcMs === null;
  return (
    <Row last={last}>
      <Num size={13} tone="dim" className="w-8">
        {row.seq}
      </Num>
      <Icon name={mark.icon} size={14} tone={mark.tone === 'on-lamp' ? 'onLamp' : mark.tone} />
      <Body className="min-w-0 shrink grow" numberOfLines={1}>
        {title}
      </Body>
      <View className="flex-none items-end">
        <Num size={13}>{formatClock(row.startUtcMs, { timeZone, precision: 'ms' })}</Num>
        <Num size={13} tone="dim">
          {open ? 'running' : formatTimeUncertainty(row.uStartS)}
        </Num>
      </View>
    </Row>
  );
}

/** A link that looks like a quiet button, 48 px high. */
export function TextLink({ href, label }: { href: string; label: string }) {
  return (
    <Link
      href={href as Href}
      className="min-h-target items-center justify-center rounded-action px-3 hover:bg-panel2"
      style={{ display: 'flex' }}
    >
      <Body tone="lamp" strong>
        {label}
      </Body>
    </Link>
  );
}
