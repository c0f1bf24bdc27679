import { useMemo, useState } from 'react';
import { View } from 'react-native';
import { Body, Button, Field, Label, Panel, Section, Select } from '@/components/ui';
import { readDecimal } from '@/components/ui/read-decimal';
import type { GBasis } from '@/shared/evaluation/g-basis';
import { inputWords, unitOfInput } from '@/shared/evaluation/input-words';
import type { EvaluationResult } from '@/shared/evaluation/result';
import { documentedValue, tryValues, type TriedValue } from '@/shared/evaluation/try-values';
import { formatPercent, UNIT_OF_G, unitSign } from '@/shared/lib/format-number';
import { formatUncertain } from '@/shared/lib/format-uncertain';
import type { RigDocument } from '@/shared/rig/document';
import { changeWords } from './evaluation-words';
import { UncertainText } from './uncertain-text';

interface TryPanelProps {
  result: EvaluationResult;
  rig: RigDocument | null;
  basis: GBasis | null;
}

/** What is typed for an input; kept as it was typed. */
interface Typed {
  value: string;
  u: string;
}

/** G and its u at once if a length, a mass or a period were otherwise. A trial: nothing is kept, here or on the server. */
export function TryPanel({ result, rig, basis }: TryPanelProps) {
  const [open, setOpen] = useState(false);
  if (rig === null || basis === null || result.budget === null || result.G === null) return null;
  return (
    <Section
      title="Try a value"
      remark="What G would be if a length, a mass or a period were otherwise. A trial: it changes nothing and is kept nowhere."
    >
      {open ? (
        <Trial result={result} rig={rig} basis={basis} onClose={() => setOpen(false)} />
      ) : (
        <Button label="Try a value" onPress={() => setOpen(true)} className="self-start" testID="try-a-value" />
      )}
    </Section>
  );
}

interface TrialProps {
  result: EvaluationResult;
  rig: RigDocument;
  basis: GBasis;
  onClose: () => void;
}

function Trial({ result, rig, basis, onClose }: TrialProps) {
  const inputs = (result.budget ?? []).map(({ input }) => input).filter((input) => documentedValue(rig, basis, input) !== null);
  const [input, setInput] = useState(inputs[0] ?? '');
  const [typed, setTyped] = useState<Record<string, Typed>>({});
  const documented = documentedValue(rig, basis, input);
  const shown = typed[input] ?? { value: String(documented?.value ?? ''), u: String(documented?.u ?? '') };
  const type = (change: Partial<Typed>) => setTyped({ ...typed, [input]: { ...shown, ...change } });
  const problems = problemsOf(shown);
  const tried = useMemo(() => Object.entries(typed).flatMap(([name, text]) => readTyped(name, text)), [typed]);
  const unit = unitSign(unitOfInput(input, rig));
  return (
    <Panel edge="lamp" className="gap-4" testID="trial">
      <Select
        label="Input"
        value={input}
        options={inputs.map((name) => ({
          value: name,
          label: typed[name] === undefined ? inputWords(name) : `${inputWords(name)} (tried)`,
        }))}
        onChange={setInput}
        testID="trial-input"
      />
      <View className="flex-row flex-wrap gap-3">
        <View className="min-w-[150px] flex-1">
          <Field
            label="Value"
            value={shown.value}
            onChange={(value) => type({ value })}
            type="number"
            unit={unit}
            error={problems.value}
            testID="trial-value"
          />
        </View>
        <View className="min-w-[150px] flex-1">
          <Field
            label="u (k = 1)"
            value={shown.u}
            onChange={(u) => type({ u })}
            type="number"
            unit={unit}
            error={problems.u}
            testID="trial-u"
          />
        </View>
      </View>
      <Outcome result={result} rig={rig} basis={basis} tried={tried} />
      <View className="flex-row flex-wrap gap-3">
        <Button
          label="Back to the documented values"
          disabled={Object.keys(typed).length === 0}
          onPress={() => setTyped({})}
          testID="trial-reset"
        />
        <Button kind="quiet" label="Close" onPress={onClose} />
      </View>
    </Panel>
  );
}

function Outcome({ result, rig, basis, tried }: Omit<TrialProps, 'onClose'> & { tried: readonly TriedValue[] }) {
  const found = useMemo(() => tryValues(rig, basis, tried), [rig, basis, tried]);
  const now = result.G;
  if (tried.length === 0 || now === null) return <Label>Change the value or its u: G follows as you type.</Label>;
  if ('why' in found)
    return (
      <View role="status" aria-live="polite">
        <Body testID="trial-outcome">No G of that: {found.why}.</Body>
      </View>
    );
  const u = found.budget?.u ?? null;
  return (
    <View role="status" aria-live="polite" className="gap-2">
      <View>
        <Label>G would be</Label>
        <UncertainText value={found.bigG} u={u} unit={UNIT_OF_G} size={20} testID="trial-outcome" />
        <Label>{changeWords(now, { value: found.bigG, u })}</Label>
      </View>
      {tried.map((one) => (
        <Label key={one.input}>
          {inputWords(one.input)}: {valueWords(one, rig)} instead of{' '}
          {valueWords({ ...one, ...documentedValue(rig, basis, one.input) }, rig)}
          {shareWords(found.budget?.lines ?? [], one.input)}
        </Label>
      ))}
    </View>
  );
}

const valueWords = ({ input, value, u }: TriedValue, rig: RigDocument) => formatUncertain({ value, u, unit: unitOfInput(input, rig) });

function shareWords(lines: readonly { input: string; share: number }[], input: string): string {
  const line = lines.find((one) => one.input === input);
  return line === undefined ? '' : `; then ${formatPercent(line.share)} of the budget`;
}

function problemsOf({ value, u }: Typed): { value: string | undefined; u: string | undefined } {
  const read = readDecimal(u);
  return {
    value: readDecimal(value) === null ? 'a number, for example 0.0751' : undefined,
    u: read === null || read < 0 ? 'a number from 0' : undefined,
  };
}

/** Nothing of what cannot be read: the fields say what would be right. */
function readTyped(input: string, text: Typed): TriedValue[] {
  const [value, u] = [readDecimal(text.value), readDecimal(text.u)];
  return value === null || u === null || u < 0 ? [] : [{ input, value, u }];
}
