import { useLocalSearchParams, type Href } from 'expo-router';
import { useState } from 'react';
import { View } from 'react-native';
import { fieldErrors, labKey, useLab, useLabMutation, useLabQuery, useMay, wordsOf } from '@/components/api';
import { useQueryClient } from '@tanstack/react-query';
import { Body, Button, Field, Heading, Label, Loading, Panel, ProblemNotice, Screen, Section } from '@/components/ui';
import { endDoor, makeDoor, readDoor } from '@/shared/contracts/doors';
import { getRig } from '@/shared/contracts/rigs';
import { formatDayAndClock } from '@/shared/lib/format-time';
import { cautions } from '@/shared/rig/cautions';

/** The card at the door: to be printed, and a public page for a screen that hangs there. */
export function DoorScreen() {
  const { rigId } = useLocalSearchParams<{ rigId: string }>();
  const rig = useLabQuery(getRig, { params: { rigId } });
  const door = useLabQuery(readDoor, { params: { rigId } });
  const failure = rig.error ?? door.error;
  const back = { href: `/rigs/${rigId}` as Href, label: rig.data?.data.name ?? 'the rig' };
  if (rig.data === undefined || door.data === undefined)
    return (
      <Screen title="Door card" back={back}>
        {failure === null ? <Loading /> : <ProblemNotice title="The door card could not be read" {...wordsOf(failure)} />}
      </Screen>
    );
  const { ring, madeAt } = door.data.data;
  return (
    <Screen title="Door card" back={back} testID="door-screen" aside={<Address rigId={rigId} ring={ring} madeAt={madeAt} />}>
      <PaperCard rigName={rig.data.data.name} ring={ring} />
      <Button icon="document" label="Print the card" onPress={() => window.print()} disabled={ring === ''} testID="print-card" />
      {ring === '' ? <Label>Say whom to ring first.</Label> : null}
    </Screen>
  );
}

/** Hangs at the door whenever somebody may not come in; says nothing that could grow old. */
function PaperCard({ rigName, ring }: { rigName: string; ring: string }) {
  const { labName } = useLab();
  return (
    <View className="paper-card gap-5 rounded-panel border-2 border-text p-6" testID="paper-card">
      <Body>
        {rigName}, {labName}
      </Body>
      <Heading level={2} size={30} className="text-[40px] leading-[46px]">
        Do not enter
      </Heading>
      <Body size={17}>While this card hangs here a measurement of gravity goes on, and heavy masses move without warning.</Body>
      <View className="gap-2">
        {cautions.slice(0, 3).map(({ title, words }) => (
          <Body key={title} size={13}>
            {title}: {words}
          </Body>
        ))}
      </View>
      <View>
        <Label>Before you enter, ring</Label>
        <Body size={20} strong>
          {ring === '' ? '…' : ring}
        </Body>
      </View>
    </View>
  );
}

function Address({ rigId, ring: kept, madeAt }: { rigId: string; ring: string; madeAt: string | null }) {
  const { labId, timeZone } = useLab();
  const queries = useQueryClient();
  const mayEdit = useMay('rig.edit');
  const [ring, setRing] = useState(kept);
  const refresh = () => void queries.invalidateQueries({ queryKey: labKey(labId, readDoor) });
  const make = useLabMutation(makeDoor, refresh);
  const end = useLabMutation(endDoor, () => {
    make.reset();
    refresh();
  });
  const made = make.data?.data;
  const error = make.error ?? end.error;
  return (
    <Section title="Page at the door">
      <Panel className="gap-3">
        <Label>
          A public page in red type for a screen at the door: keep out or not, until when, whom to ring. It needs no account and has no
          controls.
        </Label>
        {made === undefined ? null : (
          <View role="status" className="gap-1">
            <Body size={13} className="break-all font-mono" testID="door-address">
              {made.address}
            </Body>
            <Label>Shown this once. Open it on the screen at the door.</Label>
          </View>
        )}
        {madeAt === null || made !== undefined ? null : (
          <Label>It has an address, made {formatDayAndClock(Date.parse(madeAt), timeZone)}.</Label>
        )}
        {mayEdit.ok ? (
          <>
            <Field
              label="Whom to ring, and how"
              value={ring}
              onChange={setRing}
              error={fieldErrors(make.error)['ring']}
              testID="door-ring"
            />
            <View className="flex-row flex-wrap gap-2">
              <Button
                kind="primary"
                label={madeAt === null ? 'Make the page' : 'Keep, with a new address'}
                busy={make.isPending}
                onPress={() => make.mutate({ params: { rigId }, body: { ring: ring.trim() } })}
                testID="make-door"
              />
              {madeAt === null ? null : (
                <Button
                  kind="quiet"
                  label="End it"
                  busy={end.isPending}
                  onPress={() => end.mutate({ params: { rigId } })}
                  testID="end-door"
                />
              )}
            </View>
          </>
        ) : (
          <Label>{mayEdit.why}</Label>
        )}
        {error === null ? null : <ProblemNotice title="Nothing was changed" {...wordsOf(error)} />}
      </Panel>
    </Section>
  );
}
