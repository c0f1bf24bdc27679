import { useState } from 'react';
import { View } from 'react-native';
import { useLab, useLabMutation, useMay, useSession, wordsOf } from '@/components/api';
import { MayNote } from '@/components/people/may-note';
import { Body, Button, Check, Field, Icon, Label, Panel, ProblemNotice, Section, Sheet } from '@/components/ui';
import { type RigView } from '@/shared/contracts/rigs';
import { Stage } from '@/components/runs/intervention-stages';
import { liftLock, overrideLock, type LockView } from '@/shared/contracts/standing';
import { formatClock, formatDayAndClock } from '@/shared/lib/format-time';
import { VirtualInputsPanel } from './arming-progress';
import { lockSentence, useSetLock, type LockOnItsWay } from './set-lock';
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
export function LockPanel({ rig, readAtMs }: { rig: RigView; readAtMs: number }) {
  const { state } = useSession();
  const userId = state.kind === 'signed-in' ? state.me.user.id : null;
  const mayOverride = useMay('lock.override').ok;
  const setting = useSetLock(rig.id);
  const [leaving, setLeaving] = useState<{ lock: LockView; asOwner: boolean } | null>(null);
  const locks = locksKnown(rig.locks, setting.state, readAtMs);
  const own = locks.find((lock) => lock.userId === userId);
  return (
    <Section title="Personal lock">
      <LockedNotice words={lockWords(locks)} />
      <Panel className="gap-3">
        {locks.length === 0 ? (
          <Body tone="dim">
            {setting.state.kind === 'idle' || setting.state.kind === 'set' ? 'Nobody’s hands are in the rig. ' : ''}A personal lock brings
            what moves to rest, ends the arm, and keeps everybody from setting the rig in motion until whoever set it lifts it.
          </Body>
        ) : (
          locks.map((lock) => (
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
        <SetLock {...setting} isSet={own !== undefined} />
      </Panel>
      {leaving === null ? null : <LiftSheet rig={rig} {...leaving} onClose={() => setLeaving(null)} />}
    </Section>
  );
}

/** An answer that left the server before the lock was set may be this old, ms. */
const overtakenMs = 3000;

/** The locks of the rig as it was read, and one's own that the server has answered since. */
function locksKnown(read: readonly LockView[], own: LockOnItsWay, readAtMs: number): readonly LockView[] {
  if (own.kind !== 'set' || readAtMs > own.answeredAtMs + overtakenMs || read.some(({ id }) => id === own.lock.id)) return read;
  return [...read, own.lock];
}

/** To set a lock on a rig of which nothing else may be known here: neither needs what the page could not read. */
export function BlindLock({ rigId }: { rigId: string }) {
  const setting = useSetLock(rigId);
  const isSet = setting.state.kind === 'set';
  return (
    <Panel className="gap-3">
      {setting.state.kind === 'set' ? <LockedNotice words={lockWords([setting.state.lock])} /> : null}
      <SetLock {...setting} isSet={isSet} />
    </Panel>
  );
}

interface SetLockProps {
  state: LockOnItsWay;
  tap: () => void;
  isSet: boolean;
}

/** The button, and how far the lock has come: `locked` is said only when the server has it. */
function SetLock({ state, tap, isSet }: SetLockProps) {
  const { timeZone } = useLab();
  const mayLock = useMay('lock.own').ok;
  if (!mayLock) return null;
  const sentence = lockSentence(state);
  const isOnItsWay = state.kind === 'set' ? isSet : state.kind !== 'idle';
  return (
    <>
      {isOnItsWay ? (
        <View className="flex-row gap-2" testID="lock-stages">
          <Stage state="done" title="Sent" detail="" />
          <Stage
            state={state.kind === 'set' ? 'done' : state.kind === 'sending' ? 'now' : 'failed'}
            title="Server has it"
            detail={state.kind === 'set' ? formatClock(Date.parse(state.lock.since), { timeZone }) : state.kind === 'sending' ? '…' : 'no'}
          />
        </View>
      ) : null}
      <View role="alert" testID="lock-sentence">
        {sentence === '' ? null : (
          <Body strong tone="danger">
            {sentence}
          </Body>
        )}
      </View>
      {isSet ? null : <Button kind="danger" size="action" icon="hold" label="My hands are in the rig" onPress={tap} testID="set-lock" />}
    </>
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
