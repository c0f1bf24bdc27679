import { useState } from 'react';
import { View } from 'react-native';
import { callOnce, serverNowIso, useConnection, useLab, useMay, wordsOf } from '@/components/api';
import { UncertainText } from '@/components/evaluation/uncertain-text';
import { Body, Icon, Label, Num, Panel, PressAndKeep, ProblemNotice } from '@/components/ui';
import { confirmPrompt } from '@/shared/contracts/going-on';
import type { RunView } from '@/shared/contracts/runs';
import type { WaitingView } from '@/shared/contracts/waiting';
import { formatDuration } from '@/shared/lib/format-duration';
import { formatSignificant } from '@/shared/lib/format-number';
import { formatClock } from '@/shared/lib/format-time';

interface WaitingPanelProps {
  view: RunView;
  timeZone: string;
  serverNowMs: number;
}

/** What the present step waits for: each condition with its value and limit, and when it gives up; a prompt with the way to confirm it. */
export function WaitingPanel({ view, timeZone, serverNowMs }: WaitingPanelProps) {
  const { waiting } = view;
  if (waiting === null) return null;
  return (
    <Panel edge="lamp" className="gap-3" testID="waiting">
      {waiting.kind === 'prompt' ? (
        <Prompt view={view} waiting={waiting} />
      ) : (
        <Conditions waiting={waiting} timeZone={timeZone} serverNowMs={serverNowMs} />
      )}
      <GivesUp waiting={waiting} timeZone={timeZone} serverNowMs={serverNowMs} />
    </Panel>
  );
}

const after: Record<WaitingView['otherwise'], string> = {
  hold: 'then the run holds',
  continue: 'then the run goes on all the same',
  stop: 'then the run stops',
};

function GivesUp({ waiting, timeZone, serverNowMs }: { waiting: WaitingView; timeZone: string; serverNowMs: number }) {
  if (waiting.givesUpAt === null) return <Label>It waits for as long as it takes.</Label>;
  const atMs = Date.parse(waiting.givesUpAt);
  const left = Math.max(0, Math.floor((atMs - serverNowMs) / 60_000) * 60);
  return (
    <Label testID="gives-up">
      Gives up at {formatClock(atMs, { timeZone })}, in {left < 60 ? 'less than a minute' : formatDuration(left)}:{' '}
      {after[waiting.otherwise]}.
    </Label>
  );
}

function Conditions({ waiting, timeZone, serverNowMs }: { waiting: WaitingView; timeZone: string; serverNowMs: number }) {
  const firstMs = Date.parse(waiting.firstLookAt);
  const title = waiting.kind === 'settle' ? 'Until the pendulum is calm' : 'Until the channel is quiet';
  return (
    <View className="gap-3">
      <Body strong>{title}</Body>
      {serverNowMs < firstMs ? (
        <Body tone="dim">The samples of a whole window are needed: first told at {formatClock(firstMs, { timeZone })}.</Body>
      ) : null}
      {waiting.samples === 'silent' ? (
        <View className="flex-row items-center gap-2">
          <Icon name="warning" tone="danger" size={18} />
          <Body>Samples are missing, so nothing can be told.</Body>
        </View>
      ) : null}
      {waiting.readings.map((reading) => (
        <View key={reading.name} className="flex-row items-center gap-3" testID="reading">
          <Icon name={reading.met ? 'passed' : 'wait'} tone={reading.met ? 'good' : 'dim'} size={20} />
          <Body className="min-w-0 shrink grow">{reading.name}</Body>
          <View className="flex-none items-end">
            <Num size={17}>{reading.value === null ? '–' : `${formatSignificant(reading.value, 3)} ${reading.unit}`}</Num>
            <Label>
              {reading.wanted} {formatSignificant(reading.limit, 3)} {reading.unit}
              {reading.met ? ', met' : ', not yet'}
            </Label>
          </View>
        </View>
      ))}
    </View>
  );
}

/** Whoever confirms lets the masses move: pressed and kept, sent once. */
function Prompt({ view, waiting }: { view: RunView; waiting: WaitingView }) {
  const { labId } = useLab();
  const may = useMay('prompt.confirm');
  const { online } = useConnection();
  const [busy, setBusy] = useState(false);
  const [problem, setProblem] = useState<string | null>(null);
  const why = !may.ok
    ? may.why
    : !online
      ? 'The server cannot be reached; a confirmation is never kept for later.'
      : waiting.mayConfirm.why;
  const confirm = async () => {
    setBusy(true);
    setProblem(null);
    try {
      await callOnce(confirmPrompt, { params: { labId, runId: view.id }, body: { tappedAt: serverNowIso() } });
    } catch (error) {
      setProblem(wordsOf(error).detail);
    } finally {
      setBusy(false);
    }
  };
  return (
    <View className="gap-3">
      <Body size={20} strong testID="prompt-words">
        {waiting.text}
      </Body>
      <Body tone="dim">
        The rig is disarmed while people are in. When all is done, arm it again at the rig and confirm here: the run goes on at once.
      </Body>
      {why === '' ? null : (
        <Label tone="text" testID="confirm-why">
          {why}
        </Label>
      )}
      <PressAndKeep
        label="Done: go on"
        icon="start"
        statement="It is done, and nobody is within reach of the turntable; it may move."
        onConfirm={() => void confirm()}
        disabled={why !== ''}
        busy={busy}
        testID="confirm-prompt"
      />
      {problem === null ? null : <ProblemNotice title="Not confirmed" detail={problem} />}
    </View>
  );
}

const differenceMrad = ({ differenceRad, relativeU }: NonNullable<RunView['reversal']>) => {
  const value = 1000 * differenceRad;
  return { value, u: relativeU === null ? null : Math.abs(relativeU * value) };
};

/** What the run has reached: dwells that count, and how well near minus far is known so far. */
export function ReachedPanel({ view }: { view: RunView }) {
  const { dwellsDone, dwellsGood, reversal } = view;
  if (dwellsDone === 0) return null;
  const bad = dwellsDone - dwellsGood;
  return (
    <Panel className="flex-row flex-wrap gap-x-10 gap-y-3" testID="reached">
      <View>
        <Num size={20}>
          {dwellsGood} of {dwellsDone}
        </Num>
        <Label>{bad === 0 ? 'dwells good' : `dwells good, ${bad} not`}</Label>
      </View>
      {reversal === null ? null : (
        <View>
          <UncertainText size={20} {...differenceMrad(reversal)} unit="mrad" options={{ exponent: 0 }} testID="difference-reached" />
          <Label>near − far so far</Label>
        </View>
      )}
      {reversal?.relativeU == null ? null : (
        <View>
          <Num size={20} aside="%" testID="u-reached">
            {formatSignificant(100 * reversal.relativeU, 2)}
          </Num>
          <Label>u reached, by {reversal.reversals} reversals</Label>
        </View>
      )}
    </Panel>
  );
}
