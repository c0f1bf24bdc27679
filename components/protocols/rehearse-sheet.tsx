import { useRouter, type Href } from 'expo-router';
import { useState } from 'react';
import { useLabCall, wordsOf } from '@/components/api';
import { Body, Button, Field, Label, ProblemNotice, Sheet } from '@/components/ui';
import { rehearse } from '@/shared/contracts/runs';
import { formatDuration } from '@/shared/lib/format-duration';
import { useEditor } from './editor-context';
import type { DraftSync } from './use-draft-sync';

const greatestSeed = 2_147_483_646;

/** Runs the draft on the simulated rig in fast time and leads to that run. */
export function RehearseSheet({ protocolId, sync, onClose }: { protocolId: string; sync: DraftSync; onClose: () => void }) {
  const { plan, rig } = useEditor();
  const router = useRouter();
  const send = useLabCall(rehearse);
  const [seed, setSeed] = useState('1');
  const [busy, setBusy] = useState(false);
  const [problem, setProblem] = useState<ReturnType<typeof wordsOf> | null>(null);
  const number = Number(seed);
  const seedWrong = !(Number.isInteger(number) && number >= 1 && number <= greatestSeed);
  const findings = plan?.findings ?? [];
  const start = async () => {
    setBusy(true);
    setProblem(null);
    try {
      if ((await sync.flush()) === null)
        return setProblem({
          detail: 'The draft is not saved yet, and only a saved draft can be rehearsed. See why under the title.',
          errors: [],
        });
      const { data } = await send({ body: { rigId: rig?.id ?? '', protocolId, seed: number } });
      router.push(`/runs/${data.id}` as Href);
    } catch (error) {
      setProblem(wordsOf(error));
    } finally {
      setBusy(false);
    }
  };
  return (
    <Sheet
      open
      title="Rehearse"
      onClose={onClose}
      testID="rehearse-sheet"
      footer={
        <Button
          kind="primary"
          size="action"
          icon="start"
          label="Rehearse"
          disabled={rig === null || seedWrong || findings.length > 0}
          busy={busy}
          onPress={() => void start()}
          testID="rehearse-confirm"
        />
      }
    >
      <Body>
        The draft runs on a simulated {rig?.name ?? 'rig'},{' '}
        {plan === null ? 'all of it' : `all ${formatDuration(plan.timeline.durationS)} of it`} in seconds: the same engine, link protocol
        and log, a pendulum with noise and drift. Nothing real moves.
      </Body>
      {findings.length === 0 ? null : (
        <ProblemNotice
          title="It cannot be rehearsed as it is"
          detail="The same things stand against it as against issuing."
          errors={findings.map(({ path, message }) => ({ path: path ?? '', message }))}
        />
      )}
      <Field
        label="Seed"
        value={seed}
        onChange={setSeed}
        mono
        hint="The same seed gives the same night, noise included."
        error={seedWrong ? `a whole number from 1 to ${greatestSeed}` : undefined}
      />
      <Label>The result shows the G that comes back beside the G that the simulated pendulum obeys.</Label>
      {problem === null ? null : <ProblemNotice title="The rehearsal did not begin" {...problem} />}
    </Sheet>
  );
}
