import { useState } from 'react';
import { View } from 'react-native';
import { fieldErrors, useLabMutation, wordsOf } from '@/components/api';
import { Button, Field, Label, ProblemNotice, Sheet, Tabs } from '@/components/ui';
import { addBroker, reviseBroker, type BrokerView } from '@/shared/contracts/brokers';
import { draftOf, freshBroker, freshTopic, isWhole, settingOf, signInOf, type BrokerDraft } from './broker-draft';
import { TopicForm } from './topic-form';

const mostTopics = 8;

interface BrokerSheetProps {
  rigId: string;
  /** The one to be changed; null: another one is added. */
  broker: BrokerView | null;
  onClose: () => void;
}

/** Adds a broker, or changes how one is listened to. */
export function BrokerSheet({ rigId, broker, onClose }: BrokerSheetProps) {
  const [draft, setDraft] = useState(broker === null ? freshBroker : draftOf(broker));
  const add = useLabMutation(addBroker, onClose);
  const revise = useLabMutation(reviseBroker, onClose);
  const act = broker === null ? add : revise;
  const errors = fieldErrors(act.error);
  const change = (part: Partial<BrokerDraft>) => {
    setDraft({ ...draft, ...part });
    // What was said of the draft before says nothing of this one.
    if (act.isError) act.reset();
  };
  const send = () => {
    const setting = settingOf(draft);
    if (broker === null) return add.mutate({ params: { rigId }, body: { ...setting, ...signInOf(draft) } });
    const signIn = draft.signsInAsBefore ? ('as-before' as const) : signInOf(draft);
    return revise.mutate({ params: { rigId, brokerId: broker.id }, body: { ...setting, signIn } });
  };
  const { topics } = draft;
  return (
    <Sheet
      open
      title={broker === null ? 'Listen to a broker' : 'Change how a broker is listened to'}
      onClose={onClose}
      testID="broker-sheet"
      footer={
        <Button
          kind="primary"
          size="action"
          label={broker === null ? 'Listen' : 'Listen in this way'}
          disabled={!isWhole(draft)}
          busy={act.isPending}
          onPress={send}
          testID="make-broker"
        />
      }
    >
      <Connection draft={draft} change={change} errors={errors} hadSignIn={broker?.signsIn ?? false} />
      {topics.map((topic, index) => (
        <TopicForm
          key={index}
          topic={topic}
          index={index}
          only={topics.length === 1}
          onChange={(next) => change({ topics: topics.map((each, i) => (i === index ? next : each)) })}
          onRemove={() => change({ topics: topics.filter((_, i) => i !== index) })}
          errors={errors}
        />
      ))}
      {topics.length >= mostTopics ? null : (
        <Button
          icon="plus"
          label="Another topic"
          className="self-start"
          onPress={() => change({ topics: [...topics, { ...freshTopic, channel: '' }] })}
          testID="add-topic"
        />
      )}
      {broker === null ? null : <Label>What came so far stays as it is.</Label>}
      {act.isError ? (
        <ProblemNotice title={broker === null ? 'The broker was not added' : 'Nothing was changed'} {...wordsOf(act.error)} />
      ) : null}
    </Sheet>
  );
}

interface ConnectionProps {
  draft: BrokerDraft;
  change: (part: Partial<BrokerDraft>) => void;
  errors: Readonly<Record<string, string>>;
  hadSignIn: boolean;
}

/** Where it is, what proves that it is the one, and how the server signs in there. */
function Connection({ draft, change, errors, hadSignIn }: ConnectionProps) {
  return (
    <View className="gap-4">
      <Field
        label="Address"
        value={draft.address}
        onChange={(address) => change({ address })}
        hint="mqtt://host:1883, or mqtts://host:8883 with TLS."
        error={errors['address']}
        testID="broker-address"
      />
      {draft.address.trim().startsWith('mqtts:') || draft.ca !== '' ? (
        <Field
          label="Certificate of the authority that signed the broker's"
          value={draft.ca}
          onChange={(ca) => change({ ca })}
          lines={4}
          mono
          hint="PEM, from -----BEGIN CERTIFICATE----- on. Empty: the authorities that the server's system trusts."
          error={errors['ca']}
          testID="broker-ca"
        />
      ) : null}
      {hadSignIn ? (
        <Tabs
          label="Name and password"
          value={draft.signsInAsBefore ? 'before' : 'anew'}
          options={[
            { value: 'before', label: 'As before' },
            { value: 'anew', label: 'Given anew' },
          ]}
          onChange={(way) => change({ signsInAsBefore: way === 'before' })}
          testID="broker-sign-in"
        />
      ) : null}
      {errors['signIn'] === undefined ? null : (
        <Label role="alert" tone="danger">
          {errors['signIn']}
        </Label>
      )}
      {draft.signsInAsBefore ? null : (
        <>
          <Field
            label="Name at the broker"
            value={draft.userName}
            onChange={(userName) => change({ userName })}
            hint="Empty where it asks for none."
            error={errors['userName'] ?? errors['signIn.userName']}
            testID="broker-userName"
          />
          <Field
            label="Password"
            type="password"
            autoComplete="off"
            value={draft.password}
            onChange={(password) => change({ password })}
            testID="broker-password"
          />
          <Label>The password goes to the broker and is never shown again. Without TLS it crosses the network readable.</Label>
        </>
      )}
    </View>
  );
}
