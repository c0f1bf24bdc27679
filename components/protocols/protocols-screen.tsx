import { useRouter } from 'expo-router';
import { View } from 'react-native';
import { useLabQuery, useMay, wordsOf } from '@/components/api';
import { MayNote } from '@/components/people/may-note';
import { Button, Empty, Loading, ProblemNotice, Screen } from '@/components/ui';
import { listProtocols } from '@/shared/contracts/protocols';
import { ProtocolCard } from './protocol-card';
import { usePlanningRig } from './use-planning-rig';

/** All protocols of the lab, each as a small swing strip. */
export function ProtocolsScreen() {
  const router = useRouter();
  const protocols = useLabQuery(listProtocols);
  const { rig } = usePlanningRig();
  const mayWrite = useMay('protocol.write').ok;
  const items = protocols.data?.data.items ?? [];
  const begin = () => router.push('/protocols/new');
  return (
    <Screen
      title="Protocols"
      testID="protocols-screen"
      trailing={mayWrite ? <Button kind="quiet" icon="plus" label="New protocol" onPress={begin} testID="new-protocol" /> : undefined}
    >
      <MayNote act="protocol.write" />
      {protocols.isPending ? <Loading label="Loading the protocols" /> : null}
      {protocols.isError && items.length === 0 ? (
        <ProblemNotice
          title="The protocols could not be read"
          {...wordsOf(protocols.error)}
          action={{ label: 'Try again', onPress: () => void protocols.refetch() }}
        />
      ) : null}
      {protocols.isSuccess && items.length === 0 ? (
        <Empty
          title="No protocol yet"
          icon="protocols"
          action={mayWrite ? { label: 'New protocol', icon: 'plus', onPress: begin } : undefined}
        >
          A protocol says which way the masses stand, when and for how long. Begin with a template and change it.
        </Empty>
      ) : null}
      <View className="gap-4 wide:flex-row wide:flex-wrap">
        {items.map((protocol) => (
          <ProtocolCard key={protocol.id} protocol={protocol} rig={rig?.document ?? null} />
        ))}
      </View>
    </Screen>
  );
}
