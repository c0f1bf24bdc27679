import { useState } from 'react';
import { View } from 'react-native';
import { useMay } from '@/components/api';
import { RowFrames } from '@/components/cameras/row-frames';
import { ExcludeSheet } from '@/components/data/exclude-sheet';
import { ExclusionList, type Exclusions } from '@/components/data/exclusion-list';
import { excludedPart, touching, type Stretch } from '@/components/data/stretch';
import { Button, Label } from '@/components/ui';
import type { ChainedEvent } from '@/shared/archive/run-records';
import type { FrameView } from '@/shared/contracts/cameras';
import type { StepRowView } from '@/shared/contracts/runs';
import { EventList } from './event-list';
import { RowNotes, type StepNotes } from './step-notes';
import { eventsOf } from './use-events';

/** From when to when a step went; null while it goes on, and for one without any length. */
export const stretchOf = ({ startUtcMs, endUtcMs }: StepRowView): Stretch | null =>
  endUtcMs === null || endUtcMs <= startUtcMs ? null : { startUtcMs, endUtcMs };

interface StepDetailsProps {
  runId: string;
  row: StepRowView;
  events: readonly ChainedEvent[];
  timeZone: string;
  exclusions: Exclusions;
  notes: StepNotes;
  /** Of this row. */
  frames: readonly FrameView[];
}

/** What an open row of the step log shows: its events, what cameras saw, what people wrote to it, and what of its samples is excluded or was. */
export function StepDetails({ runId, row, events, timeZone, exclusions, notes, frames }: StepDetailsProps) {
  const stretch = stretchOf(row);
  return (
    <View className="gap-4">
      <EventList events={eventsOf(events, row)} timeZone={timeZone} />
      <RowFrames runId={runId} frames={frames} />
      <RowNotes {...notes} runId={runId} seq={row.seq} />
      {stretch === null ? null : <StepExclusions {...{ runId, exclusions, stretch }} seq={row.seq} />}
    </View>
  );
}

function StepExclusions({ runId, exclusions, stretch, seq }: { runId: string; exclusions: Exclusions; stretch: Stretch; seq: number }) {
  const may = useMay('data.exclude');
  const [asks, setAsks] = useState(false);
  const own = touching(exclusions.exclusions, stretch);
  return (
    <View className="gap-3">
      <ExclusionList {...exclusions} exclusions={own} />
      {excludedPart(own, stretch) === 'excluded' ? null : may.ok ? (
        <Button label="Exclude its samples" onPress={() => setAsks(true)} className="self-start" testID="exclude" />
      ) : (
        <Label>{may.why}</Label>
      )}
      {asks ? (
        <ExcludeSheet
          runId={runId}
          step={stretch}
          title={`Exclude samples of step ${String(seq)}`}
          onClose={() => setAsks(false)}
          onDone={exclusions.onChanged}
        />
      ) : null}
    </View>
  );
}
