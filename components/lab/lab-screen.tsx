import { Screen, Section } from '@/components/ui';
import { Account } from './account';
import { Appearance } from './appearance';
import { GivenUpJobs } from './given-up-jobs';
import { LabSettings } from './lab-settings';
import { AlarmsLink } from './alarms-link';
import { AuditLink } from './audit-link';
import { Members } from './members';
import { OnCall } from './on-call';
import { OwnCall } from './own-call';
import { RetentionLink } from './retention-link';
import { RoleMatrix } from './role-matrix';
import { Watcher } from './watcher';

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
      <AlarmsLink />
      <RetentionLink />
      <AuditLink />
      <OnCall />
      <OwnCall />
      <Watcher />
      <Members />
      <GivenUpJobs />
    </Screen>
  );
}
