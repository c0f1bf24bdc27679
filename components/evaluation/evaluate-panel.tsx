import { useState } from 'react';
import { View } from 'react-native';
import { useLabQuery, useMay, wordsOf } from '@/components/api';
import { Body, Button, Label, Panel, ProblemNotice, Select } from '@/components/ui';
import { readSamples } from '@/shared/contracts/data';
import { ClockChooser, useClockChoice } from './clock-chooser';
import type { useEvaluations } from './use-evaluations';

interface EvaluatePanelProps {
  runId: string;
  evaluations: ReturnType<typeof useEvaluations>;
  /** The channel registered with the protocol, chosen first. */
  registeredChannel: string | null;
}

/** Starts an evaluation, says how far it is, and why it failed. */
export function EvaluatePanel({ runId, evaluations, registeredChannel }: EvaluatePanelProps) {
  const may = useMay('evaluate');
  const samples = useLabQuery(readSamples, { params: { runId }, query: { points: 10 } });
  const channels = (samples.data?.data.channels ?? []).filter((channel) => channel.role === 'deflection').map((channel) => channel.name);
  const [chosen, setChosen] = useState<string | null>(null);
  const channel =
    chosen ?? (registeredChannel !== null && channels.includes(registeredChannel) ? registeredChannel : (channels[0] ?? null));
  const { newest, busy, start, startError, done } = evaluations;
  const clock = useClockChoice(done?.result?.alignment ?? null);
  const begin = () => {
    const choice = clock.read();
    if (choice !== null) start({ channel: channel ?? undefined, clock: choice });
  };
  if (busy) return <AtWork state={newest?.state ?? 'queued'} />;
  return (
    <Panel className="gap-3" testID="evaluate-panel">
      {startError === null ? null : <ProblemNotice title="The evaluation did not start" {...wordsOf(startError)} />}
      {newest?.state === 'failed' && newest.error !== null ? <ProblemNotice title="The evaluation failed" detail={newest.error} /> : null}
      {samples.isSuccess && channels.length === 0 ? <Body>This run has no deflection data yet. Bring some in first.</Body> : null}
      {channels.length > 1 ? (
        <Select
          label="Deflection channel"
          value={channel ?? ''}
          options={channels.map((name) => ({ value: name, label: name === registeredChannel ? `${name} (registered)` : name }))}
          onChange={setChosen}
        />
      ) : null}
      {done === null || !may.ok ? null : <ClockChooser {...clock} />}
      <View className="flex-row flex-wrap items-center gap-3">
        <Button
          kind={done === null ? 'primary' : 'plain'}
          label={done === null ? 'Evaluate' : 'Evaluate again'}
          disabled={!may.ok || channels.length === 0}
          onPress={begin}
          testID="evaluate"
        />
        {may.ok ? null : (
          <Label className="shrink" tone="text">
            {may.why}
          </Label>
        )}
      </View>
    </Panel>
  );
}

function AtWork({ state }: { state: string }) {
  return (
    <Panel className="gap-2" testID="evaluation-at-work">
      <View role="status" aria-live="polite" className="gap-2">
        <Body strong>{state === 'queued' ? 'Waiting for its turn' : 'Evaluating'}</Body>
        <Label>
          Fitting period, decay and the centre of every dwell together, then drift, torque and budget. It goes on if you leave this page.
        </Label>
      </View>
      <View className="h-1.5 overflow-hidden rounded-full bg-panel2" aria-hidden>
        <View className={`h-1.5 rounded-full bg-lamp ${state === 'queued' ? 'w-1/6' : 'w-2/3'}`} />
      </View>
    </Panel>
  );
}
