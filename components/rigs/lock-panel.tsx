import { useState } from 'react';
import { View } from 'react-native';
import { useLab, useLabMutation, useMay, useSession, wordsOf } from '@/components/api';
import { MayNote } from '@/components/people/may-note';
import { Body, Button, Check, Field, Icon, Label, Panel, ProblemNotice, Section, Sheet } from '@/components/ui';
import { type RigView } from '@/shared/contracts/rigs';
import { liftLock, overrideLock, setLock, type LockView } from '@/shared/contracts/standing';
import { formatDayAndClock } from '@/shared/lib/format-time';
import { VirtualInputsPanel } from './arming-progress';
import { useRefreshRigs } from './use-rig';

/** Large on every screen from which the rig could be set in motion: somebody's hands are in it. */
export function LockedNotice({ words }: { words: string | null }) {
  if (words === null) return null;
  return (
    <View role="alert" className="flex-row items-center gap-4 rounded-panel border-4 border-danger bg-panel p-4" testID="locked-notice">
      <Icon name="warning" size={32} tone="danger" />
      <Body size={20} strong className="shrink">
        {words}
      </Body>
    </View>
  );
}

/** The locks of a rig in a sentence; null while there are none. */
export function lockWords(locks: readonly Pick<LockView, 'name'>[]): string | null {
  const names = locks.map(({ name }) => name);
  const last = names.pop();
  if (last === undefined) return null;
  const [who, verb] = names.length === 0 ? [last, 'has hands'] : [`${names.join(', ')} and ${last}`, 'have hands'];
  return `${who} ${verb} in the rig. Nothing moves.`;
}

/** One's own lock is set with one tap, in the safe direction, and lifted at the rig by the one who set it. */
export function LockPanel({ rig }: { rig: RigView }) {
  const { state } = useSession();
  const userId = state.kind === 'signed-in' ? state.me.user.id : null;
  const mayLock = useMay('lock.own').ok;
  const mayOverride = useMay('lock.override').ok;
  const refresh = useRefreshRigs();
  const set = useLabMutation(setLock, refresh);
  const [leaving, setLeaving] = useState<{ lock: LockView; asOwner: boolean } | null>(null);
  const own = rig.locks.find((lock) => lock.userId === userId);
  return (
    <Section title="Personal lock">
      <LockedNotice words={lockWords(rig.locks)} />
      <Panel className="gap-3">
        {rig.locks.length === 0 ? (
          <Body tone="dim">
            Nobody’s hands are in the rig. A personal lock brings what moves to rest, ends the arm, and keeps everybody from setting the rig
            in motion until whoever set it lifts it.
          </Body>
        ) : (
          rig.locks.map((lock) => (
            <LockRow
              key={lock.id}
              lock={lock}
              own={lock.userId === userId}
              mayOverride={mayOverride}
              onLift={(asOwner) => setLeaving({ lock, asOwner })}
            />
          ))
        )}
        <MayNote act="lock.own" />
        {mayLock && own === undefined ? (
          <Button
            kind="danger"
            size="action"
            icon="hold"
            label="My hands are in the rig"
            busy={set.isPending}
            onPress={() => set.mutate({ params: { rigId: rig.id }, body: {} })}
            testID="set-lock"
          />
        ) : null}
        {set.isError ? <ProblemNotice title="The lock was not set: use the switch at the rig" {...wordsOf(set.error)} /> : null}
      </Panel>
      {leaving === null ? null : <LiftSheet rig={rig} {...leaving} onClose={() => setLeaving(null)} />}
    </Section>
  );
}

interface LockRowProps {
  lock: LockView;
  own: boolean;
  mayOverride: boolean;
  onLift: (asOwner: boolean) => void;
}

function LockRow({ lock, own, mayOverride, onLift }: LockRowProps) {
  const { timeZone } = useLab();
  return (
    <View className="flex-row flex-wrap items-center justify-between gap-3">
      <View className="shrink">
        <Body strong>{lock.name}</Body>
        <Label>
          since {formatDayAndClock(Date.parse(lock.since), timeZone)}
          {lock.note === '' ? '' : `: ${lock.note}`}
        </Label>
      </View>
      {own ? <Button label="Lift my lock" onPress={() => onLift(false)} testID="lift-lock" /> : null}
      {mayOverride ? <Button kind="quiet" label="Lift it as owner" onPress={() => onLift(true)} testID="override-lock" /> : null}
    </View>
  );
}

/** The owner of the lock says that the hands are out; an owner of the lab says why the lock of another is lifted. */
function LiftSheet({ rig, lock, asOwner, onClose }: { rig: RigView; lock: LockView; asOwner: boolean; onClose: () => void }) {
  const refresh = useRefreshRigs();
  const done = () => {
    refresh();
    onClose();
  };
  const lift = useLabMutation(liftLock, done);
  const override = useLabMutation(overrideLock, done);
  const [sure, setSure] = useState(false);
  const [reason, setReason] = useState('');
  const params = { rigId: rig.id, lockId: lock.id };
  const own = !asOwner;
  const act = own ? lift : override;
  const send = () =>
    own ? lift.mutate({ params, body: { handsOut: true } }) : override.mutate({ params, body: { reason: reason.trim() } });
  return (
    <Sheet
      open
      title={own ? 'Lift my lock' : `Lift the lock of ${lock.name}`}
      onClose={onClose}
      testID="lift-sheet"
      footer={
        <Button
          kind="primary"
          size="action"
          label={own ? 'Lift it' : 'Lift it as owner'}
          disabled={!sure || (!own && reason.trim().length < 3)}
          busy={act.isPending}
          onPress={send}
          testID="lift-confirm"
        />
      }
    >
      <Body>The rig stays disarmed: it moves again only after it was armed at the rig.</Body>
      {own ? (
        <>
          <Body>Turn the arm key at the rig, on or off, at most 2 minutes before: it shows that you are there.</Body>
          <VirtualInputsPanel rig={rig} />
        </>
      ) : (
        <Field
          label="Why it is lifted without the key"
          value={reason}
          onChange={setReason}
          hint="Kept in the audit chain with your name."
          testID="override-reason"
        />
      )}
      <Check
        label={own ? 'I am at the rig, and my hands are out of it.' : `I have made sure that the hands of ${lock.name} are not in the rig.`}
        value={sure}
        onChange={setSure}
        testID="lift-sure"
      />
      {act.isError ? <ProblemNotice title="The lock was not lifted" {...wordsOf(act.error)} /> : null}
    </Sheet>
  );
}
