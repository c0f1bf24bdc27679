import { Screen, Section } from '@/components/ui';
import { Account } from './account';
import { Appearance } from './appearance';
import { GivenUpJobs } from './given-up-jobs';
import { LabSettings } from './lab-settings';
import { Members } from './members';
import { RoleMatrix } from './role-matrix';

/** The lab: how it looks here, who is in it, what each may do. */
export function LabScreen() {
  return (
    <Screen
      title="Lab"
      testID="lab-screen"
      aside={
        <>
          <Account />
          <Section title="Roles">
            <RoleMatrix />
          </Section>
        </>
      }
    >
      <Appearance />
      <LabSettings />
      <Members />
      <GivenUpJobs />
    </Screen>
  );
}
