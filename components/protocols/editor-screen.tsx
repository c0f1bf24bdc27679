import { useLocalSearchParams } from 'expo-router';
import { useLabQuery, wordsOf } from '@/components/api';
import { Loading, ProblemNotice, Screen } from '@/components/ui';
import { getProtocol } from '@/shared/contracts/protocols';
import { Editor } from './editor';

/** Loads a protocol and hands it to the editor, which then keeps its own draft. */
export function EditorScreen() {
  const { protocolId } = useLocalSearchParams<{ protocolId: string }>();
  const query = useLabQuery(getProtocol, { params: { protocolId } });
  const etag = query.data?.etag ?? null;
  if (query.data === undefined || etag === null) {
    return (
      <Screen title="Protocol" back={{ href: '/protocols', label: 'protocols' }}>
        {query.isError ? (
          <ProblemNotice
            title="The protocol could not be read"
            {...wordsOf(query.error)}
            action={{ label: 'Try again', onPress: () => void query.refetch() }}
          />
        ) : (
          <Loading label="Loading the protocol" />
        )}
      </Screen>
    );
  }
  return <Editor key={protocolId} protocol={query.data.data} etag={etag} />;
}
