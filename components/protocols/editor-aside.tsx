import { View } from 'react-native';
import { Section } from '@/components/ui';
import { useEditor } from './editor-context';
import { FindingsList } from './findings-list';
import { ProtocolDetails } from './protocol-details';
import { StepDetails } from './step-details';
import { stepTitle } from './step-words';
import type { PlanningRig } from './use-planning-rig';

interface EditorAsideProps {
  planning: PlanningRig;
  startAt: string;
  onStartAt: (startAt: string) => void;
}

/** The right pane: details of the step in hand, else of the protocol; findings under it. */
export function EditorAside(props: EditorAsideProps) {
  const { selected, selectedStep } = useEditor();
  return (
    <View className="gap-6" testID="editor-aside">
      {selected === null || selectedStep === null ? (
        <Section title="Protocol">
          <ProtocolDetails {...props} />
        </Section>
      ) : (
        <Section title={`Step ${selected.join('.')}: ${stepTitle(selectedStep)}`}>
          <StepDetails path={selected} />
        </Section>
      )}
      <FindingsList />
    </View>
  );
}
