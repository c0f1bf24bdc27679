import { View } from 'react-native';
import { useLab, useLabMutation, useMay, useSession, wordsOf } from '@/components/api';
import { MayNote } from '@/components/people/may-note';
import { Body, Button, Icon, Label, ProblemNotice } from '@/components/ui';
import { type RigView } from '@/shared/contracts/rigs';
import { signCautions, type SignatureView } from '@/shared/contracts/standing';
import { formatDayAndClock } from '@/shared/lib/format-time';
import { cautions, cautionsVersion } from '@/shared/rig/cautions';
import { useRefreshRigs } from './use-rig';

/** The signature of whoever is signed in under the present words of the cautions; null while there is none. */
export function useOwnSignature(rig: Pick<RigView, 'signatures'>): SignatureView | null {
  const { state } = useSession();
  const userId = state.kind === 'signed-in' ? state.me.user.id : null;
  return rig.signatures.find((one) => one.userId === userId && one.version === cautionsVersion) ?? null;
}

/** The cautions, one line each, and the signature under them: kept with its date and the version of the words. */
export function CautionsPanel({ rig }: { rig: RigView }) {
  const { timeZone } = useLab();
  const maySign = useMay('cautions.sign').ok;
  const own = useOwnSignature(rig);
  const refresh = useRefreshRigs();
  const sign = useLabMutation(signCautions, refresh);
  return (
    <View className="gap-2.5 rounded-panel border border-line p-4" testID="cautions">
      {cautions.map((caution) => (
        <View key={caution.title}>
          <Body strong>{caution.title}</Body>
          <Body size={13} tone="dim">
            {caution.words}
          </Body>
        </View>
      ))}
      {own === null ? (
        <>
          <MayNote act="cautions.sign" />
          {maySign ? (
            <Button
              label="I have read these cautions and seen to them: sign"
              busy={sign.isPending}
              onPress={() => sign.mutate({ params: { rigId: rig.id }, body: { version: cautionsVersion } })}
              testID="sign-cautions"
            />
          ) : null}
        </>
      ) : (
        <View className="flex-row items-center gap-2 pt-1" testID="cautions-signed">
          <Icon name="passed" size={16} tone="good" />
          <Label tone="text" className="shrink">
            Signed by {own.name} for this rig, {formatDayAndClock(Date.parse(own.at), timeZone)}, version {own.version}
          </Label>
        </View>
      )}
      {sign.isError ? <ProblemNotice title="Not signed" {...wordsOf(sign.error)} /> : null}
    </View>
  );
}
