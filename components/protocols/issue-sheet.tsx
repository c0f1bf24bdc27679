import { useQueryClient } from '@tanstack/react-query';
import { useState } from 'react';
import { View } from 'react-native';
import { labKey, useLab, useLabCall, useLabQuery, wordsOf } from '@/components/api';
import { Body, Button, Field, Icon, Label, Loading, ProblemNotice, Section, Sheet, useToast } from '@/components/ui';
import { getProtocol, getRevision, issueRevision, listProtocols, type ProtocolView } from '@/shared/contracts/protocols';
import { DifferencesList } from './differences-list';
import { useEditor } from './editor-context';
import type { DraftSync } from './use-draft-sync';

interface IssueSheetProps {
  protocol: ProtocolView;
  sync: DraftSync;
  onClose: () => void;
}

/** Issues the draft as the next revision: checked against a rig, with what it changes and a note. Issued revisions never change. */
export function IssueSheet({ protocol, sync, onClose }: IssueSheetProps) {
  const { plan, rig } = useEditor();
  const next = (protocol.latestRevision ?? 0) + 1;
  const findings = plan?.findings ?? [];
  const [note, setNote] = useState('');
  const issue = useIssue({ protocol, sync, note, onDone: onClose });
  const ready = rig !== null && findings.length === 0;
  return (
    <Sheet
      open
      title={`Issue revision ${next}`}
      onClose={onClose}
      testID="issue-sheet"
      footer={
        <Button
          kind="primary"
          size="action"
          label={`Issue revision ${next}`}
          disabled={!ready}
          busy={issue.busy}
          onPress={() => void issue.send(rig?.id ?? '')}
          testID="issue-confirm"
        />
      }
    >
      {rig === null ? <Body>A revision is checked against a rig, and this lab has none yet.</Body> : null}
      {findings.length > 0 ? (
        <ProblemNotice
          title={`${findings.length} ${findings.length === 1 ? 'thing stands' : 'things stand'} against it on ${rig?.name ?? 'this rig'}`}
          detail="Put these right first; each is marked at its step."
          errors={findings.map(({ path, message }) => ({ path: path ?? '', message }))}
        />
      ) : rig === null ? null : (
        <View className="flex-row items-center gap-2">
          <Icon name="passed" tone="good" />
          <Body className="flex-1">Checked against {rig.name}: it can be carried out.</Body>
        </View>
      )}
      <Field
        label="Note"
        value={note}
        onChange={setNote}
        placeholder="what is different and why"
        hint="An issued revision never changes; runs refer to it for ever."
        testID="issue-note"
      />
      {issue.problem === null ? null : <ProblemNotice title="The revision was not issued" {...issue.problem} />}
      <ChangesSinceLast protocol={protocol} />
    </Sheet>
  );
}

function ChangesSinceLast({ protocol }: { protocol: ProtocolView }) {
  const { document } = useEditor();
  const latest = protocol.latestRevision;
  const revision = useLabQuery(getRevision, {
    params: { protocolId: protocol.id, revision: String(latest ?? 0) },
    enabled: latest !== null,
  });
  if (latest === null) return <Label>It will be the first revision.</Label>;
  return (
    <Section title={`Changes since revision ${latest}`}>
      {revision.data === undefined ? (
        <Loading label={`Reading revision ${latest}`} />
      ) : (
        <DifferencesList before={revision.data.data.document} after={document} />
      )}
    </Section>
  );
}

interface IssueInput {
  protocol: ProtocolView;
  sync: DraftSync;
  note: string;
  onDone: () => void;
}

/** Saves what is unsaved, then issues exactly that. */
function useIssue({ protocol, sync, note, onDone }: IssueInput) {
  const { labId } = useLab();
  const queries = useQueryClient();
  const toast = useToast();
  const send = useLabCall(issueRevision);
  const [busy, setBusy] = useState(false);
  const [problem, setProblem] = useState<ReturnType<typeof wordsOf> | null>(null);
  const attempt = async (rigId: string) => {
    setBusy(true);
    setProblem(null);
    try {
      const ifMatch = await sync.flush();
      if (ifMatch === null)
        return setProblem({ detail: 'The draft is not saved yet, and only a saved draft is issued. See why under the title.', errors: [] });
      const { data } = await send({ params: { protocolId: protocol.id }, ifMatch, body: { rigId, note: note.trim() } });
      for (const route of [getProtocol, listProtocols]) await queries.invalidateQueries({ queryKey: labKey(labId, route) });
      toast.show({ text: `Revision ${data.number} is issued.` });
      onDone();
    } catch (error) {
      setProblem(wordsOf(error));
    } finally {
      setBusy(false);
    }
  };
  return { busy, problem, send: attempt };
}
