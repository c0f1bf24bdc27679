import { useQueryClient } from '@tanstack/react-query';
import { useRouter, type Href } from 'expo-router';
import { useState } from 'react';
import { Pressable, View } from 'react-native';
import { labKey, useLab, useLabMutation, useMay, wordsOf } from '@/components/api';
import { Body, Button, Heading, Label, Panel, ProblemNotice, Screen, Section } from '@/components/ui';
import { createProtocol, listProtocols } from '@/shared/contracts/protocols';
import { formatDuration } from '@/shared/lib/format-duration';
import type { ProtocolDocument } from '@/shared/protocol/document';
import { emptyDocument } from '@/shared/protocol/new-step';
import { templates, type Template } from '@/shared/protocol/templates';
import { demoRigWide } from '@/shared/rig/demo-rigs';
import type { RigDocument } from '@/shared/rig/document';
import { ImportSheet } from './import-sheet';
import { Miniature } from './miniature';
import { makeMiniature } from './plan';
import { usePlanningRig } from './use-planning-rig';

/** Where a protocol begins: a template, a document of one's own, or nothing. */
export function NewProtocolScreen() {
  const { rig, none } = usePlanningRig();
  const mayWrite = useMay('protocol.write');
  const [importing, setImporting] = useState(false);
  const create = useCreate();
  const begin = (document: ProtocolDocument) => create.mutate({ body: { document } });
  const planned = rig?.document ?? (none ? demoRigWide : null);
  return (
    <Screen title="New protocol" back={{ href: '/protocols', label: 'protocols' }} testID="new-protocol-screen">
      {mayWrite.ok ? null : <Body tone="dim">{mayWrite.why}</Body>}
      {create.isError ? <ProblemNotice title="The protocol was not made" {...wordsOf(create.error)} /> : null}
      <Panel className="flex-row flex-wrap gap-3">
        <Button
          icon="plus"
          label="From nothing"
          disabled={!mayWrite.ok || create.isPending}
          onPress={() => begin({ ...emptyDocument('New protocol'), steps: [{ kind: 'home' }] })}
          testID="from-nothing"
        />
        <Button
          icon="import"
          label="From a file or text"
          disabled={!mayWrite.ok || create.isPending}
          onPress={() => setImporting(true)}
          testID="from-file"
        />
      </Panel>
      <Section title="Templates" remark={rig === null ? undefined : `Drawn for ${rig.name}: lengths follow the period of its pendulum.`}>
        {planned === null
          ? null
          : templates.map((template) => (
              <TemplateCard
                key={template.id}
                template={template}
                rig={planned}
                disabled={!mayWrite.ok || create.isPending}
                onPress={() => begin(template.make(planned))}
              />
            ))}
      </Section>
      {importing ? <ImportSheet onDocument={begin} onClose={() => setImporting(false)} /> : null}
    </Screen>
  );
}

function useCreate() {
  const { labId } = useLab();
  const queries = useQueryClient();
  const router = useRouter();
  return useLabMutation(createProtocol, ({ data }) => {
    void queries.invalidateQueries({ queryKey: labKey(labId, listProtocols) });
    router.replace(`/protocols/${data.id}` as Href);
  });
}

interface TemplateCardProps {
  template: Template;
  rig: RigDocument;
  disabled: boolean;
  onPress: () => void;
}

function TemplateCard({ template, rig, disabled, onPress }: TemplateCardProps) {
  const { timeZone } = useLab();
  const [document] = useState(() => template.make(rig));
  const [{ timeline }] = useState(() => makeMiniature({ document, rig, timeZone, startUtcMs: 0 }));
  return (
    <Pressable
      role="button"
      aria-label={`Begin with ${template.name}. ${template.summary}`}
      disabled={disabled}
      onPress={onPress}
      testID={`template-${template.id}`}
      className={`gap-3 rounded-panel border border-panel bg-panel p-4 hover:border-line ${disabled ? 'opacity-50' : ''}`}
    >
      <View className="flex-row items-baseline justify-between gap-3">
        <Heading level={3} size={17} className="shrink">
          {template.name}
        </Heading>
        <Label className="font-mono tabular">{formatDuration(timeline.durationS)}</Label>
      </View>
      <View className="h-11">
        <Miniature document={document} rig={rig} />
      </View>
      <Body tone="dim">{template.summary}</Body>
    </Pressable>
  );
}
