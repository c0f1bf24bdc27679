import { useState } from 'react';
import { View } from 'react-native';
import { useLab, useSession, wordsOf } from '@/components/api';
import { Body, Button, Label, Panel, Section, Select } from '@/components/ui';

/** Who is signed in here, in which lab, and the way out. */
export function Account() {
  const { state, signOut, chooseLab } = useSession();
  const { labId } = useLab();
  const [failure, setFailure] = useState<string | null>(null);
  if (state.kind !== 'signed-in' && state.kind !== 'expired') return null;
  const { user, memberships } = state.me;
  return (
    <Section title="You">
      <Panel className="gap-4">
        <View>
          <Body strong size={17}>
            {user.name}
          </Body>
          <Label>{user.email}</Label>
        </View>
        {memberships.length < 2 ? null : (
          <Select
            label="Lab"
            value={labId}
            options={memberships.map((each) => ({ value: each.labId, label: `${each.labName} (${each.role})` }))}
            onChange={chooseLab}
          />
        )}
        {failure === null ? null : (
          <Body role="alert" tone="danger">
            {failure}
          </Body>
        )}
        <Button
          label="Sign out"
          icon="leave"
          className="self-start"
          testID="sign-out"
          onPress={() => void signOut().catch((error: unknown) => setFailure(wordsOf(error).detail))}
        />
      </Panel>
    </Section>
  );
}
