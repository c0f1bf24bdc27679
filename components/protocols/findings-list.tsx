import { Pressable, View } from 'react-native';
import { Body, Icon, Label, Section } from '@/components/ui';
import type { Finding } from '@/shared/protocol/finding';
import { parseStepPath, stepAt } from '@/shared/protocol/step-path';
import { useEditor } from './editor-context';
import { stepTitle } from './step-words';

/** What must be put right before issuing, then what would make the protocol better; each leads to its step. */
export function FindingsList() {
  const { plan } = useEditor();
  if (plan === null || (plan.findings.length === 0 && plan.advice.length === 0)) return null;
  return (
    <>
      {plan.findings.length === 0 ? null : (
        <Section title="To put right">
          {plan.findings.map((finding) => (
            <FindingLine key={`${finding.code} ${finding.path} ${finding.message}`} finding={finding} wrong />
          ))}
        </Section>
      )}
      {plan.advice.length === 0 ? null : (
        <Section title="Advice">
          {plan.advice.map((advice) => (
            <FindingLine key={`${advice.code} ${advice.path} ${advice.message}`} finding={advice} wrong={false} />
          ))}
        </Section>
      )}
    </>
  );
}

/** The first sentence is what counts and stands out; the rest explains. */
function sentences(message: string): [string, string] {
  const end = message.search(/[.:] (?=[A-Z])/);
  return end === -1 ? [message, ''] : [message.slice(0, end + 1), message.slice(end + 1)];
}

function FindingLine({ finding, wrong }: { finding: Finding; wrong: boolean }) {
  const { document, openDetails, select } = useEditor();
  const path = finding.path === null ? null : parseStepPath(finding.path);
  const step = path === null ? null : stepAt(document, path);
  const [first, rest] = sentences(finding.message);
  const shape = `flex-row items-start gap-3 rounded-panel border-l-4 bg-panel p-4 ${wrong ? 'border-danger' : 'border-lamp'}`;
  const inside = (
    <>
      <Icon name={wrong ? 'warning' : 'note'} tone={wrong ? 'danger' : 'lamp'} />
      <View className="min-w-0 flex-1 gap-1">
        {step === null || path === null ? null : (
          <Label>
            Step {path.join('.')}, {stepTitle(step)}
          </Label>
        )}
        <Body strong>{first}</Body>
        {rest === '' ? null : <Body>{rest.trim()}</Body>}
      </View>
    </>
  );
  if (path === null || step === null) return <View className={shape}>{inside}</View>;
  return (
    <Pressable
      role="button"
      aria-label={`${finding.message} Go to step ${path.join('.')}`}
      onPress={() => (select(path), openDetails(path))}
      className={`${shape} hover:bg-panel2`}
      testID={`finding-${finding.code}`}
    >
      {inside}
    </Pressable>
  );
}
