import { useState } from 'react';
import { View } from 'react-native';
import { useLabQuery, useMay, wordsOf } from '@/components/api';
import { MayNote } from '@/components/people/may-note';
import { Button, Empty, Loading, ProblemNotice, Screen } from '@/components/ui';
import { listRigs } from '@/shared/contracts/rigs';
import { AddRigSheet } from './add-rig-sheet';
import { RigCard } from './rig-card';

/** All rigs of the lab with what each is doing. */
export function RigsScreen() {
  const rigs = useLabQuery(listRigs, { everyMs: 2000 });
  const mayEdit = useMay('rig.edit').ok;
  const [adding, setAdding] = useState(false);
  const items = rigs.data?.data.items ?? [];
  return (
    <Screen
      title="Rigs"
      testID="rigs-screen"
      trailing={mayEdit ? <Button kind="quiet" icon="plus" label="Add a rig" onPress={() => setAdding(true)} /> : undefined}
    >
      {rigs.isPending ? <Loading label="Loading the rigs" /> : null}
      {rigs.isError && items.length === 0 ? (
        <ProblemNotice
          title="The rigs could not be read"
          {...wordsOf(rigs.error)}
          action={{ label: 'Try again', onPress: () => void rigs.refetch() }}
        />
      ) : null}
      {rigs.isSuccess && items.length === 0 ? (
        <Empty
          title="No rig yet"
          icon="rig"
          action={mayEdit ? { label: 'Add a rig', icon: 'plus', onPress: () => setAdding(true) } : undefined}
        >
          A rig is one turntable with its pendulum. It is added from a rig document, or from one of two examples to start with.
        </Empty>
      ) : null}
      {rigs.isSuccess && items.length === 0 ? <MayNote act="rig.edit" /> : null}
      <View className="gap-4 wide:flex-row wide:flex-wrap">
        {items.map((rig) => (
          <RigCard key={rig.id} rig={rig} />
        ))}
      </View>
      {adding ? <AddRigSheet onClose={() => setAdding(false)} /> : null}
    </Screen>
  );
}
