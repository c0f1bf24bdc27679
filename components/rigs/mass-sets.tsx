import { useState } from 'react';
import { View } from 'react-native';
import { useLabMutation, useMay, wordsOf } from '@/components/api';
import { Body, Button, Field, Label, Panel, ProblemNotice, Section, Sheet, Tabs } from '@/components/ui';
import { addMassSet, type MassSetView, type RigView } from '@/shared/contracts/rigs';
import { readDecimal } from '@/components/ui/read-decimal';
import { quantityLine } from './quantity-words';
import { useRefreshRigs } from './use-rig';

/** What may sit on the turntable; one run has one mass set. */
export function MassSets({ rig }: { rig: RigView }) {
  const mayEdit = useMay('rig.edit').ok;
  const [adding, setAdding] = useState(false);
  return (
    <Section
      title="Mass sets"
      trailing={
        mayEdit ? (
          <Button
            kind="quiet"
            icon="plus"
            label="Add"
            accessibilityLabel="Add a mass set"
            onPress={() => setAdding(true)}
            testID="add-mass-set"
          />
        ) : undefined
      }
    >
      <Panel className="py-1">
        {rig.massSets.length === 0 ? <Label className="py-3">No mass set yet. A run needs one, an empty control included.</Label> : null}
        {rig.massSets.map((set, index) => (
          <View key={set.id} className={`min-h-target justify-center py-2.5 ${index === 0 ? '' : 'border-t border-line'}`}>
            <Body strong>{set.label}</Body>
            <Label>{sourcesLine(set.sources)}</Label>
          </View>
        ))}
      </Panel>
      {adding ? <MassSetSheet rig={rig} onClose={() => setAdding(false)} /> : null}
    </Section>
  );
}

/** The sources of a mass set on one line. */
function sourcesLine(sources: MassSetView['sources']): string {
  if (sources.shape === 'none') return 'empty control: no sources';
  const row = (label: string, quantity: { value: number; u: number; unit: string } | undefined) =>
    quantity === undefined ? null : `${label} ${quantityLine({ path: '', group: '', label: '', kind: 'quantity', ...quantity })}`;
  return [`2 ${sources.shape}s`, row('mass', sources.mass), row('radius', sources.radius), row('orbit', sources.orbit)]
    .filter(Boolean)
    .join(', ');
}

type Kind = 'like' | 'none';

/** A further mass set: spheres of another mass and size on the rig's orbit, or the empty control. */
function MassSetSheet({ rig, onClose }: { rig: RigView; onClose: () => void }) {
  const refresh = useRefreshRigs();
  const base = rig.document.sources;
  const [kind, setKind] = useState<Kind>(base.shape === 'none' ? 'none' : 'like');
  const [label, setLabel] = useState('');
  const [mass, setMass] = useState(String(base.mass?.value ?? ''));
  const [uMass, setUMass] = useState(String(base.mass?.u ?? ''));
  const numbers = { value: readDecimal(mass), u: readDecimal(uMass) };
  const wrong = kind === 'like' && !(numbers.value !== null && numbers.value > 0 && numbers.u !== null && numbers.u >= 0);
  const add = useLabMutation(addMassSet, () => {
    refresh();
    onClose();
  });
  const submit = () => {
    const sources: MassSetView['sources'] =
      kind === 'none'
        ? { shape: 'none', ...(base.extra === undefined ? {} : { extra: base.extra }) }
        : { ...base, mass: { value: numbers.value ?? 0, u: numbers.u ?? 0, unit: 'kg' } };
    add.mutate({ params: { rigId: rig.id }, body: { label: label.trim(), sources } });
  };
  return (
    <Sheet
      open
      title="Add a mass set"
      onClose={onClose}
      footer={
        <Button
          kind="primary"
          size="action"
          label="Add the mass set"
          disabled={label.trim() === '' || wrong}
          busy={add.isPending}
          onPress={submit}
        />
      }
    >
      <Field label="Name" value={label} onChange={setLabel} placeholder="Tungsten spheres, 1.6 kg" />
      {base.shape === 'none' ? null : (
        <Tabs
          label="What sits on the turntable"
          value={kind}
          options={[
            { value: 'like', label: `${base.shape === 'sphere' ? 'Spheres' : 'Cylinders'}` },
            { value: 'none', label: 'Nothing: empty control' },
          ]}
          onChange={setKind}
        />
      )}
      {kind === 'none' ? (
        <Label>The same timing without sources: what is left is what turns along and what disturbs.</Label>
      ) : (
        <View className="flex-row gap-3">
          <View className="flex-1">
            <Field label="Mass of a source" value={mass} onChange={setMass} type="number" unit="kg" />
          </View>
          <View className="flex-1">
            <Field label="Standard uncertainty" value={uMass} onChange={setUMass} type="number" unit="kg" />
          </View>
        </View>
      )}
      {add.isError ? <ProblemNotice title="The mass set was not added" {...wordsOf(add.error)} /> : null}
    </Sheet>
  );
}
