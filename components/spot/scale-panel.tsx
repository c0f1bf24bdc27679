import { useState } from 'react';
import { View } from 'react-native';
import { Body, Button, Field, IconButton, Label, Panel, Section } from '@/components/ui';
import { readDecimal } from '@/components/ui/read-decimal';
import { formatFixed, formatPercent, formatSignificant } from '@/shared/lib/format-number';
import { formatUncertain } from '@/shared/lib/format-uncertain';
import { meanPxOf } from '@/shared/spot/health';
import { fitScale, lineOf, type Mark } from '@/shared/spot/scale';
import { KeepScale } from './keep-scale';
import { NumberField } from './number-field';
import type { SpotPage } from './use-spot-reader';

/** Which column shows which millimetre: marks, the line through them, and how far each is off it. */
export function ScalePanel({ page, rigId, linePx }: { page: SpotPage; rigId: string; linePx: number | null }) {
  const { setting, change } = page;
  const { marks, uMarkMm } = setting;
  const scale = fitScale(marks, uMarkMm);
  const replace = (index: number, mark: Mark) => change({ marks: marks.map((each, i) => (i === index ? mark : each)) });
  return (
    <Section
      title="Scale"
      remark="Two marks make a scale; from three on their residuals show whether it is straight. Five over the whole range are good."
    >
      <Panel className="gap-4" testID="spot-scale">
        {marks.map((mark, index) => (
          <View key={index} className="gap-1" testID="spot-mark">
            <View className="flex-row items-end gap-2">
              <View className="min-w-0 flex-1">
                <NumberField
                  label={`Mark ${index + 1}, column`}
                  value={mark.px}
                  unit="px"
                  onChange={(px) => replace(index, { ...mark, px })}
                />
              </View>
              <View className="min-w-0 flex-1">
                <NumberField label="on the scale" value={mark.mm} unit="mm" onChange={(mm) => replace(index, { ...mark, mm })} />
              </View>
              <IconButton
                icon="remove"
                label={`Take mark ${index + 1} away`}
                onPress={() => change({ marks: marks.filter((_, i) => i !== index) })}
              />
            </View>
            {scale === null || scale.scatterMm === null ? null : (
              <Label>off the line by {formatFixed(scale.residualsMm[index] ?? 0, { decimals: 3, signed: true })} mm</Label>
            )}
          </View>
        ))}
        <AddMark page={page} linePx={linePx} />
        <NumberField
          label="Standard uncertainty of a mark"
          value={uMarkMm}
          unit="mm"
          onChange={(value) => (value > 0 ? change({ uMarkMm: value }) : undefined)}
          testID="u-mark"
        />
        {marks.length < 2 ? null : <Fit marks={marks} uMarkMm={uMarkMm} />}
        {scale === null || setting.channel === '' ? null : (
          <KeepScale rigId={rigId} channel={setting.channel} scale={scale} marks={marks.length} />
        )}
      </Panel>
    </Section>
  );
}

function AddMark({ page, linePx }: { page: SpotPage; linePx: number | null }) {
  const { view, setting, change } = page;
  const [text, setText] = useState('');
  const mm = readDecimal(text);
  const spotPx = view.camera.kind === 'open' ? meanPxOf(view.health) : null;
  const add = (px: number) => {
    if (mm === null) return;
    change({ marks: [...setting.marks, { px, mm }] });
    setText('');
  };
  return (
    <View className="gap-2">
      <Field
        label="What the scale says at the new mark"
        value={text}
        type="number"
        unit="mm"
        onChange={setText}
        error={text !== '' && mm === null ? 'a number' : undefined}
        testID="mark-mm"
      />
      <View className="flex-row flex-wrap gap-2">
        <Button
          icon="plus"
          label="Where the spot is"
          disabled={mm === null || spotPx === null}
          onPress={() => add(spotPx ?? 0)}
          testID="mark-spot"
        />
        <Button
          icon="plus"
          label="At the dashed line"
          disabled={mm === null || linePx === null}
          onPress={() => add(linePx ?? 0)}
          testID="mark-line"
        />
      </View>
    </View>
  );
}

function Fit({ marks, uMarkMm }: { marks: readonly Mark[]; uMarkMm: number }) {
  const scale = fitScale(marks, uMarkMm);
  if (scale === null)
    return (
      <Body role="alert" tone="danger" testID="scale-fit">
        These marks make no scale: they lie in one column, or show the same millimetre. Mark two places that are far apart.
      </Body>
    );
  const { mmPerPx, uMmPerPx, scatterMm } = scale;
  const line = lineOf(scale);
  return (
    <View className="gap-1" testID="scale-fit">
      <Body>
        {formatUncertain({ value: mmPerPx, u: uMmPerPx, unit: 'mm' })} for each px, that is ± {formatPercent(uMmPerPx / Math.abs(mmPerPx))}{' '}
        of every difference.
      </Body>
      <Label testID="scale-line">
        At column 0 {formatUncertain({ value: line.offset, u: line.uOffset, unit: 'mm' })}; covariance with the slope{' '}
        {formatSignificant(line.covariance, 2)} mm²/px, correlation {formatSignificant(line.covariance / (line.uOffset * line.uSlope), 2)}.
      </Label>
      <Label>
        {scatterMm === null
          ? 'Two marks lie on a line whatever they are: add a third to see whether the scale is straight.'
          : `The marks scatter by ${formatSignificant(scatterMm, 2)} mm about the line${scatterMm > uMarkMm ? ', more than was stated: the scatter counts' : ''}.`}
      </Label>
    </View>
  );
}
