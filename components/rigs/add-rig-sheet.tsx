import { useRouter, type Href } from 'expo-router';
import { useState } from 'react';
import { useLabMutation, wordsOf } from '@/components/api';
import { Body, Button, Field, Label, ProblemNotice, Select, Sheet } from '@/components/ui';
import { createRig } from '@/shared/contracts/rigs';
import { demoRigNarrow, demoRigWide } from '@/shared/rig/demo-rigs';
import type { RigDocument } from '@/shared/rig/document';
import { RigImportSheet } from './rig-import-sheet';
import { useRefreshRigs } from './use-rig';

const examples = {
  wide: { label: 'Example: wide turntable, turns freely', document: demoRigWide },
  close: { label: 'Example: close turntable with a keep-out arc', document: demoRigNarrow },
} as const;
type From = keyof typeof examples | 'import';

/** Adds a rig from an example or from a rig document, reached over the simulated link until its own is chosen. */
export function AddRigSheet({ onClose }: { onClose: () => void }) {
  const router = useRouter();
  const refresh = useRefreshRigs();
  const [name, setName] = useState('');
  const [from, setFrom] = useState<From>('wide');
  const [imported, setImported] = useState<RigDocument | null>(null);
  const [reading, setReading] = useState(false);
  const create = useLabMutation(createRig, ({ data }) => {
    refresh();
    onClose();
    router.push(`/rigs/${data.id}` as Href);
  });
  const document = from === 'import' ? imported : examples[from].document;
  const options = [
    ...(Object.keys(examples) as (keyof typeof examples)[]).map((key) => ({ value: key as From, label: examples[key].label })),
    { value: 'import' as From, label: 'A rig document of yours (JSON)' },
  ];
  return (
    <Sheet
      open
      title="Add a rig"
      onClose={onClose}
      footer={
        <Button
          kind="primary"
          size="action"
          label="Add the rig"
          disabled={name.trim() === '' || document === null}
          busy={create.isPending}
          onPress={() =>
            document === null ? undefined : create.mutate({ body: { name: name.trim(), document, link: { kind: 'simulated' } } })
          }
        />
      }
    >
      <Field label="Name" value={name} onChange={setName} placeholder="North bench" hint="As a sign on the door would have it." />
      <Select label="Begin with" value={from} options={options} onChange={setFrom} />
      {from === 'import' ? (
        <>
          <Button
            icon="import"
            label={imported === null ? 'Read the document' : 'Read another document'}
            onPress={() => setReading(true)}
          />
          <Body tone={imported === null ? 'dim' : 'good'}>{imported === null ? 'No document read yet.' : 'The document is read.'}</Body>
        </>
      ) : (
        <Label>Numbers of a careful teaching laboratory; put your own in afterwards, each change makes a revision.</Label>
      )}
      <Label>The rig starts on the simulated link. Choose its own line on the rig page.</Label>
      {create.isError ? <ProblemNotice title="The rig was not added" {...wordsOf(create.error)} /> : null}
      {reading ? <RigImportSheet title="Read a rig document" onDocument={setImported} onClose={() => setReading(false)} /> : null}
    </Sheet>
  );
}
