import { useMemo } from 'react';
import { useLab } from '@/components/api';
import { SwingStrip } from '@/components/charts/swing-strip';
import type { ProtocolDocument } from '@/shared/protocol/document';
import type { RigDocument } from '@/shared/rig/document';
import { makeMiniature } from './plan';
import { useMinute } from './use-plan';

/** A protocol as a small swing strip. */
export function Miniature({ document, rig }: { document: ProtocolDocument; rig: RigDocument }) {
  const { timeZone } = useLab();
  const startUtcMs = useMinute();
  const plan = useMemo(() => makeMiniature({ document, rig, timeZone, startUtcMs }), [document, rig, timeZone, startUtcMs]);
  return <SwingStrip size="mini" steps={plan.strip} predicted={plan.predicted} timeZone={timeZone} title={document.name} />;
}
