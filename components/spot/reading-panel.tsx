import { View } from 'react-native';
import { Body, Label, Panel, Section, Tabs } from '@/components/ui';
import type { Region } from '@/shared/spot/intensities';
import { regionFault } from '@/shared/spot/setting';
import { NumberField } from './number-field';
import type { SpotPage } from './use-spot-reader';

const sides = [
  ['left', 'First column'],
  ['top', 'First row'],
  ['width', 'Columns'],
  ['height', 'Rows'],
] as const;

/** What in the picture is read: the region by numbers, which light, centre or edge. */
export function ReadingPanel({ page }: { page: SpotPage }) {
  const { setting, change, view } = page;
  const { region } = setting;
  const fault = region === null || view.picture === null ? null : regionFault(region, view.picture);
  const set = (part: Partial<Region>) => (region === null ? undefined : change({ region: { ...region, ...part } }));
  return (
    <Section title="What is read" remark="The scale runs across the picture, from left to right or from right to left.">
      <Panel className="gap-4" testID="spot-region">
        {region === null ? (
          <Label>The region can be drawn when the camera is open.</Label>
        ) : (
          <View className="flex-row flex-wrap gap-3">
            {sides.map(([side, label]) => (
              <View key={side} className="min-w-[120px] flex-1">
                <NumberField
                  label={label}
                  value={region[side]}
                  onChange={(value) => set({ [side]: value })}
                  unit="px"
                  whole
                  testID={`region-${side}`}
                />
              </View>
            ))}
          </View>
        )}
        {fault === null ? null : (
          <Body role="alert" tone="danger" size={13}>
            {fault}
          </Body>
        )}
        <Tabs
          label="What of the spot"
          value={setting.of}
          options={[
            { value: 'centre', label: 'Centre' },
            { value: 'left', label: 'Left edge' },
            { value: 'right', label: 'Right edge' },
          ]}
          onChange={(of) => change({ of })}
          testID="spot-of"
        />
        <Tabs
          label="Colour of its light"
          value={setting.light}
          options={[
            { value: 'all', label: 'White' },
            { value: 'red', label: 'Red' },
            { value: 'green', label: 'Green' },
            { value: 'blue', label: 'Blue' },
          ]}
          onChange={(light) => change({ light })}
          testID="spot-light"
        />
        <Label>
          The centroid suits a round spot or a slit; an edge suits a broad band of light whose other side leaves the picture. Whatever is
          chosen, mark the scale anew by it.
        </Label>
      </Panel>
    </Section>
  );
}
