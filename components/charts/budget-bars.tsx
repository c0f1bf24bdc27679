import { View } from 'react-native';
import { Body, Label, Num } from '@/components/ui';
import { formatPercent } from '@/shared/lib/format-number';
import { inputWords } from '@/shared/evaluation/input-words';
import type { BudgetLine } from '@/shared/evaluation/result';

/** The budget as bars, greatest share first; the smallest ones in one line. */
export function BudgetBars({ lines, limit = 8 }: { lines: readonly BudgetLine[]; limit?: number }) {
  const sorted = [...lines].sort((a, b) => b.share - a.share);
  const shown = sorted.filter((line, index) => index < limit && line.share >= 0.0005);
  const rest = sorted.slice(shown.length).reduce((sum, line) => sum + line.share, 0);
  return (
    <View role="list" className="gap-3" testID="budget-bars">
      {shown.map((line, index) => (
        <Bar key={line.input} words={inputWords(line.input)} share={line.share} first={index === 0} />
      ))}
      {sorted.length > shown.length ? <Bar words={`${sorted.length - shown.length} more together`} share={rest} first={false} /> : null}
    </View>
  );
}

function Bar({ words, share, first }: { words: string; share: number; first: boolean }) {
  const percent = share > 0 && share < 0.0005 ? '< 0.05\u202f%' : formatPercent(share);
  return (
    <View role="listitem" className="gap-1">
      <View className="flex-row items-baseline justify-between gap-3">
        {first ? (
          <Body strong className="shrink">
            {words}
          </Body>
        ) : (
          <Label size={15} className="shrink">
            {words}
          </Label>
        )}
        <Num strong={first}>{percent}</Num>
      </View>
      <View className="h-2 overflow-hidden rounded-full bg-panel2" aria-hidden>
        <View className={`h-2 rounded-full ${first ? 'bg-lamp' : 'bg-faint'}`} style={{ width: `${Math.max(0.6, share * 100)}%` }} />
      </View>
    </View>
  );
}
