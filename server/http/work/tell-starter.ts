import { alarmOfHold } from '@/shared/alarms/of-holds';
import type { RunStart } from '@/shared/archive/run-records';
import { askForRunNotice, type RunNotice } from '../../notify/run-notices';
import type { Services } from '../services';
import { untilStored } from '../until-stored';
import { askForMorning } from './morning-job';

const isEnd = (topic: RunNotice['topic']) => topic === 'finished' || topic === 'stopped' || topic === 'failed';

/** Lets whoever started a run hear of it; what is an alarm tells itself. */
export function tellStarter(services: Services, start: RunStart, { topic, text }: Pick<RunNotice, 'topic' | 'text'>): void {
  const { labId, runId } = start;
  services.log.info({ runId, topic }, text);
  if (start.simulated === null && isEnd(topic)) untilStored(services, () => askForMorning(services, start), 'the morning sheet of a run');
  const { reasonCode = '' } = services.supervisor.driverOf(runId)?.facts() ?? {};
  const isAlarm = topic === 'failed' || ((topic === 'held' || topic === 'stopped') && alarmOfHold(reasonCode) !== null);
  if (isAlarm || start.simulated !== null) return;
  untilStored(
    services,
    async () => {
      await askForRunNotice(services.database.db, { labId, runId, topic, text }, services.clock.utcMs());
      services.pokeJobs();
    },
    'a message about a run',
  );
}
