import { useRouter, type Href } from 'expo-router';
import { View } from 'react-native';
import { useMay } from '@/components/api';
import { MayNote } from '@/components/people/may-note';
import { Body, Button, Icon, Label, Panel, Section } from '@/components/ui';
import type { RigView } from '@/shared/contracts/rigs';
import { formatSignificant } from '@/shared/lib/format-number';
import { linkName } from './link-words';

/** Over which line the controller is reached, and how well. */
export function LinkPanel({ rig }: { rig: RigView }) {
  const router = useRouter();
  const mayEdit = useMay('rig.edit').ok;
  const { roundTripMs, discardedLines } = rig.live;
  return (
    <Section title="Link">
      <Panel className="gap-3">
        <View className="flex-row items-start gap-3">
          <Icon name="link" tone="dim" />
          <View className="flex-1 gap-0.5">
            <Body strong>{linkName(rig.link)}</Body>
            <Label>
              {roundTripMs === null ? 'no reply yet' : `reply within ${formatSignificant(roundTripMs, 2)} ms`}
              {discardedLines === 0 ? '' : `, ${discardedLines} garbled ${discardedLines === 1 ? 'line' : 'lines'} set aside`}
            </Label>
          </View>
        </View>
        <MayNote act="rig.edit" />
        {mayEdit ? (
          <Button
            label="Change or try the link"
            className="self-start"
            onPress={() => router.push(`/rigs/${rig.id}/link` as Href)}
            testID="change-link"
          />
        ) : null}
      </Panel>
    </Section>
  );
}
