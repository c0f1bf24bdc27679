import { useMutation, useQuery, useQueryClient } from '@tanstack/react-query';
import { useState } from 'react';
import { View } from 'react-native';
import { call, wordsOf } from '@/components/api';
import { Body, Button, Label, ProblemNotice } from '@/components/ui';
import { addPushDevice, getPushKey, listPushDevices, removePushDevice } from '@/shared/contracts/calls';
import { PushRefused, subscribeHere, whyNoPush } from './push-subscription';

const queryKey = ['push-devices'];

const pushWords = (error: unknown) => (error instanceof PushRefused ? { detail: error.message } : wordsOf(error));

/** My browsers that take push messages, and whether this one does. */
export function PushDevices() {
  const queries = useQueryClient();
  const [obstacle] = useState(whyNoPush);
  const list = useQuery({ queryKey, queryFn: () => call(listPushDevices) });
  const refresh = () => void queries.invalidateQueries({ queryKey });
  const add = useMutation({
    mutationFn: async () => {
      const { publicKey } = (await call(getPushKey)).data;
      return call(addPushDevice, { body: await subscribeHere(publicKey) });
    },
    onSuccess: refresh,
  });
  const remove = useMutation({ mutationFn: (deviceId: string) => call(removePushDevice, { params: { deviceId } }), onSuccess: refresh });
  const items = list.data?.data.items ?? [];
  return (
    <View className="gap-2" testID="push-devices">
      <Body strong>Push messages</Body>
      {items.length === 0 ? <Label>None of your browsers takes push messages: alarms come by mail only.</Label> : null}
      {items.map(({ id, device }) => (
        <View key={id} className="flex-row items-center justify-between gap-3">
          <Body className="min-w-0 flex-1">{device}</Body>
          <Button
            kind="quiet"
            label="Remove"
            accessibilityLabel={`No more push messages to ${device}`}
            busy={remove.isPending}
            onPress={() => remove.mutate(id)}
          />
        </View>
      ))}
      {obstacle === null ? (
        <Button label="Let this browser take push messages" busy={add.isPending} onPress={() => add.mutate()} testID="add-push" />
      ) : (
        <Label>{obstacle}</Label>
      )}
      {add.isError ? <ProblemNotice title="This browser takes no push messages" {...pushWords(add.error)} /> : null}
      {remove.isError ? <ProblemNotice title="The browser was not removed" {...wordsOf(remove.error)} /> : null}
    </View>
  );
}
