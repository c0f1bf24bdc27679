import { useEffect } from 'react';
import type { Href } from 'expo-router';
import { Body, Chip, Label, Loading, Panel, Screen } from '@/components/ui';
import type { RunView } from '@/shared/contracts/runs';
import { useNow } from './use-now';
import { formatDuration } from '@/shared/lib/format-duration';

const askEveryMs = 1500;

/** A rehearsal is worked out in one go, a whole night in seconds: there is nothing to hold or stop. */
export function RehearsalAtWork({ view, refresh }: { view: RunView; refresh: () => void }) {
  const now = useNow(1000);
  useEffect(() => {
    const timer = setInterval(refresh, askEveryMs);
    return () => clearInterval(timer);
  }, [refresh]);
  const sinceS = Math.max(0, (now - Date.parse(view.createdAt)) / 1000);
  return (
    <Screen
      title="Rehearsal"
      back={{ href: '/runs' as Href, label: 'Runs' }}
      trailing={<Chip tone="lamp">rehearsal</Chip>}
      testID="rehearsal-at-work"
    >
      <Panel className="gap-2">
        <Loading label={`Rehearsing ${view.protocolName}`} />
        <Body className="text-center">The whole run on the simulated {view.rigName}, in fast time. Nothing moves in the lab.</Body>
        <Label className="text-center">
          {view.dwellsPlanned} dwells; at work for {formatDuration(Math.round(sinceS))}. It goes on if you leave this page.
        </Label>
      </Panel>
    </Screen>
  );
}
