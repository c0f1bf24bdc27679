import { useLocalSearchParams, useRouter, type Href } from 'expo-router';
import { useState } from 'react';
import { fieldErrors, useLabMutation, useMay, wordsOf } from '@/components/api';
import { HealthPanel, InputsPanel } from '@/components/link/line-panels';
import { useLiveLine } from '@/components/link/use-live-line';
import { Body, Button, Check, Heading, Icon, Loading, Panel, ProblemNotice, Screen, Section, useToast } from '@/components/ui';
import { takeController } from '@/shared/contracts/link';
import { changeLink, tryLink, type LinkSettings, type RigView } from '@/shared/contracts/rigs';
import { LinkForm } from './link-form';
import { linkName, wrongFields } from './link-words';
import { useRefreshRigs, useRig } from './use-rig';

/** The page on which the line to a rig's controller is chosen and tried. */
export function LinkScreen() {
  const { rigId } = useLocalSearchParams<{ rigId: string }>();
  const query = useRig(rigId);
  const rig = query.data?.data;
  const back = { href: `/rigs/${rigId}` as Href, label: rig?.name ?? 'the rig' };
  if (rig === undefined) {
    return (
      <Screen title="Link" back={back}>
        {query.isError ? (
          <ProblemNotice title="The rig could not be read" {...wordsOf(query.error)} />
        ) : (
          <Loading label="Loading the rig" />
        )}
      </Screen>
    );
  }
  return <LinkPage rig={rig} etag={query.data?.etag ?? undefined} />;
}

/** The line as it is now for everybody; the choice of another and the first move for those who may. */
function LinkPage({ rig, etag }: { rig: RigView; etag: string | undefined }) {
  const { line } = useLiveLine(rig.id);
  return (
    <Screen
      title={`Link of ${rig.name}`}
      back={{ href: `/rigs/${rig.id}` as Href, label: rig.name }}
      testID="link-screen"
      aside={
        <>
          <HealthPanel line={line} />
          <InputsPanel line={line} />
        </>
      }
    >
      {line?.health.keptOutBy == null ? null : <KeptOut rig={rig} keptOutBy={line.health.keptOutBy} />}
      <FirstMoveEntry rig={rig} />
      <Section title="Line to the controller">
        <LinkChoice rig={rig} etag={etag} />
      </Section>
    </Screen>
  );
}

/** The controller obeys another server: whoever knows that this one is gone takes it over. */
function KeptOut({ rig, keptOutBy }: { rig: RigView; keptOutBy: number }) {
  const mayEdit = useMay('rig.edit');
  const [sure, setSure] = useState(false);
  const take = useLabMutation(takeController);
  return (
    <Panel className="gap-3" edge="danger" testID="kept-out">
      <Heading level={2}>This controller obeys another server</Heading>
      <Body>
        It was last driven under number {keptOutBy} and refuses everything below. If that server still runs, let it have the rig: two
        servers on one rig would take it from each other. If it is gone (a database set up anew or put back, a board from another lab), take
        the controller over; its limits and its position are kept.
      </Body>
      {mayEdit.ok ? (
        <Check
          label="The other server is gone, or no longer has to do with this rig"
          value={sure}
          onChange={setSure}
          testID="other-is-gone"
        />
      ) : (
        <Body tone="dim">{mayEdit.why}</Body>
      )}
      {take.error === null ? null : <ProblemNotice title="The controller was not taken over" {...wordsOf(take.error)} />}
      {mayEdit.ok ? (
        <Button
          label="Take the controller over"
          className="self-start"
          disabled={!sure}
          busy={take.isPending}
          onPress={() => take.mutate({ params: { rigId: rig.id }, body: { keptOutBy } })}
          testID="take-controller"
        />
      ) : null}
    </Panel>
  );
}

function FirstMoveEntry({ rig }: { rig: RigView }) {
  const router = useRouter();
  return (
    <Panel className="gap-3" edge="lamp">
      <Body>
        A new drive, motor, belt or board: find out at the rig which way the table turns, how many microsteps make a degree and how far it
        may go, and teach the controller its limits.
      </Body>
      <Button
        label="First move"
        className="self-start"
        onPress={() => router.push(`/rigs/${rig.id}/first-move` as Href)}
        testID="first-move"
      />
    </Panel>
  );
}

function LinkChoice({ rig, etag }: { rig: RigView; etag: string | undefined }) {
  const router = useRouter();
  const toast = useToast();
  const refresh = useRefreshRigs();
  const mayEdit = useMay('rig.edit');
  const [link, setLink] = useState<LinkSettings>(rig.link);
  const attempt = useLabMutation(tryLink);
  const save = useLabMutation(changeLink, () => {
    refresh();
    toast.show({ text: `${rig.name} is now reached over ${linkName(link)}.` });
    router.replace(`/rigs/${rig.id}` as Href);
  });
  const problem = attempt.error ?? save.error;
  const params = { rigId: rig.id };
  const unusable = Object.keys(wrongFields(link)).length > 0;
  if (!mayEdit.ok) return <Body tone="dim">{mayEdit.why}</Body>;
  return (
    <>
      <LinkForm
        link={link}
        onChange={(next) => {
          attempt.reset();
          save.reset();
          setLink(next);
        }}
        errors={fieldErrors(problem)}
      />
      {attempt.data === undefined ? null : <TryResult {...attempt.data.data} />}
      {problem === null ? null : (
        <ProblemNotice title={attempt.isError ? 'The link could not be tried' : 'The link was not changed'} {...wordsOf(problem)} />
      )}
      <Button
        icon="link"
        label="Try: say hello, move nothing"
        busy={attempt.isPending}
        disabled={unusable}
        onPress={() => attempt.mutate({ params, body: link })}
        testID="try-link"
      />
      <Button
        kind="primary"
        size="action"
        label="Use this link"
        busy={save.isPending}
        disabled={unusable}
        onPress={() => save.mutate({ params, ifMatch: etag, body: link })}
        testID="save-link"
      />
    </>
  );
}

function TryResult({ ok, detail, firmware }: { ok: boolean; detail: string; firmware: string | null }) {
  return (
    <Panel edge={ok ? 'good' : 'danger'} className="flex-row items-start gap-3" testID="try-result">
      <Icon name={ok ? 'passed' : 'failed'} tone={ok ? 'good' : 'danger'} />
      <Body role="status" className="flex-1">
        {detail}
        {firmware === null ? '' : ` Firmware: ${firmware}.`}
      </Body>
    </Panel>
  );
}
