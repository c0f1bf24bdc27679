import { useQuery } from '@tanstack/react-query';
import { useLab, useLabCall, wordsOf } from '@/components/api';
import { Body, Button, Loading, ProblemNotice, Section, Sheet } from '@/components/ui';
import { getProtocol } from '@/shared/contracts/protocols';
import { formatDayAndClock } from '@/shared/lib/format-time';
import type { ProtocolDocument } from '@/shared/protocol/document';
import { DifferencesList } from './differences-list';
import type { DraftSync } from './use-draft-sync';

interface ConflictSheetProps {
  protocolId: string;
  mine: ProtocolDocument;
  sync: DraftSync;
  onTheirs: (document: ProtocolDocument) => void;
}

/** Somebody else saved the draft meanwhile: who, what differs, and whose is kept. Nothing is lost before the choice, and undo brings mine back. */
export function ConflictSheet({ protocolId, mine, sync, onTheirs }: ConflictSheetProps) {
  const { labId, timeZone } = useLab();
  const read = useLabCall(getProtocol);
  const theirs = useQuery({
    queryKey: [labId, 'conflict', protocolId],
    queryFn: () => read({ params: { protocolId } }),
    gcTime: 0,
    staleTime: 0,
  });
  const view = theirs.data?.data;
  const etag = theirs.data?.etag ?? null;
  if (view === undefined || etag === null) {
    return (
      <Sheet open title="Saved by somebody else" onClose={() => undefined} mustAnswer>
        {theirs.isError ? (
          <ProblemNotice
            title="Their draft could not be read"
            {...wordsOf(theirs.error)}
            action={{ label: 'Try again', onPress: () => void theirs.refetch() }}
          />
        ) : (
          <Loading label="Reading the other draft" />
        )}
      </Sheet>
    );
  }
  const takeTheirs = () => {
    onTheirs(view.document);
    sync.adopt(etag, view.document);
  };
  return (
    <Sheet
      open
      title="Saved by somebody else"
      onClose={() => undefined}
      mustAnswer
      testID="conflict-sheet"
      footer={
        <>
          <Button
            kind="primary"
            size="action"
            label="Keep mine, over theirs"
            onPress={() => sync.adopt(etag, view.document)}
            testID="keep-mine"
          />
          <Button size="action" label="Take theirs" onPress={takeTheirs} testID="take-theirs" />
        </>
      }
    >
      <Body>
        {view.updatedBy} saved this draft at {formatDayAndClock(Date.parse(view.updatedAt), timeZone)}, after you opened it. Yours is not
        saved yet. If you take theirs, undo brings yours back.
      </Body>
      <Section title="From theirs to mine">
        <DifferencesList before={view.document} after={mine} />
      </Section>
    </Sheet>
  );
}
