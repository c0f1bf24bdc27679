import { demoIds } from '@/db/demo/seed';
import type { ImportChoices, ImportMapping } from '@/shared/contracts/data';
import type { LabServer } from '@/tests/support/lab-server';

const labPath = `/labs/${demoIds.lab}`;

export const mapping: ImportMapping = {
  delimiter: ',',
  decimal: '.',
  headerRow: true,
  timeColumn: 0,
  timeFormat: 'iso',
  valueColumn: 1,
  unit: 'urad',
};

/** Deflection files of a run and what is asked about them, as an analyst. */
export function deflectionFiles(from: () => { lab: LabServer; runId: string; startUtcMs: number; endUtcMs: number }) {
  /** Half a hertz of deflection over the whole run. */
  function deflection(change: (line: string, index: number) => string | null = (line) => line): string {
    const lines = Array.from(
      { length: Math.floor((from().endUtcMs - from().startUtcMs) / 2000) },
      (_, index) => `${new Date(from().startUtcMs + 2000 * index).toISOString()},${(100 * Math.sin(index / 40)).toFixed(3)}`,
    );
    return `time_utc,deflection_urad\n${lines
      .map(change)
      .filter((line) => line !== null)
      .join('\n')}\n`;
  }

  async function begin(fileName = 'night.csv'): Promise<string> {
    const answer = await from().lab.as('analyst', 'POST', `${labPath}/runs/${from().runId}/imports`).send({ fileName }).expect(201);
    return answer.body.id as string;
  }

  const put = (importId: string, text: string | Buffer, type = 'text/csv') =>
    from().lab.as('analyst', 'PUT', `${labPath}/imports/${importId}/content`).set('Content-Type', type).send(text);
  const check = (importId: string, change: Partial<ImportMapping> = {}, channelName = 'readout') =>
    from()
      .lab.as('analyst', 'POST', `${labPath}/imports/${importId}/check`)
      .send({ mapping: { ...mapping, ...change }, channelName });
  const commit = (
    importId: string,
    channelName: string,
    { choices, ...change }: Partial<ImportMapping> & { choices?: Partial<ImportChoices> } = {},
  ) =>
    from()
      .lab.as('analyst', 'POST', `${labPath}/imports/${importId}/commit`)
      .send({ mapping: { ...mapping, ...change }, channelName, choices });
  const sent = async (text: string) => {
    const id = await begin();
    await put(id, text).expect(200);
    return id;
  };

  return { deflection, begin, put, check, commit, sent };
}
