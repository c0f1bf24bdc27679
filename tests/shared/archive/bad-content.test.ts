import { buildArchive } from '@/shared/archive/build-archive';
import { sha256Hex } from '@/server/evaluation/sha256';
import { bare, read, text } from '../../support/changed-archive';
import { smallArchiveInput } from '../../support/small-archive';

describe('bad content is refused with file, row and column', () => {
  const header = text(buildArchive(smallArchiveInput(), sha256Hex).get('steps.csv')).split('\n')[0] as string;
  const row = '1,1.dwell,dwell,,near,,,2026-03-01T22:00:00.000Z,2026-03-01T22:10:00.000Z,0,0,20.18,20.18,done,,,';
  const steps = (...rows: string[]) => bare('steps.csv', [header, ...rows, ''].join('\n'));

  test('a plain row of only what is known is read', () => {
    expect(read(steps(row)).steps[0]).toMatchObject({ seq: 1, angleEndDeg: 20.18, angleSource: 'counted', good: null });
  });

  test.each([
    [
      'a time without Z',
      steps(row, row.replace('22:10:00.000Z', '22:10:00.000').replace('1,1', '2,2')),
      'steps.csv, row 3, column end_utc: "2026-03-01T22:10:00.000" is not a UTC time',
    ],
    [
      'an end before the start',
      steps(row.replace('22:10:00', '21:10:00')),
      'steps.csv, row 2, column end_utc: the step ends before it starts',
    ],
    [
      'an angle that is no number',
      steps(row.replace('20.18,done', 'NaN,done')),
      'steps.csv, row 2, column angle_end_deg: "NaN" is not a number',
    ],
    [
      'an angle in another notation',
      steps(row.replace('20.18,done', '0x14,done')),
      'steps.csv, row 2, column angle_end_deg: "0x14" is not a number',
    ],
    ['an unknown kind', steps(row.replace(',dwell,', ',nap,')), 'steps.csv, row 2, column kind: "nap" is none of home, swing, dwell'],
    ['an unknown outcome', steps(row.replace('done', 'fine')), 'steps.csv, row 2, column outcome: "fine" is none of done'],
    ['a number that comes twice', steps(row, row), 'steps.csv, row 3, column seq: 1 does not come after 1'],
    ['a row that is too short', steps('1,1.dwell,dwell'), 'steps.csv, row 2: the row has 3 cells, the header 17'],
    ['a missing column', bare('steps.csv', 'seq,kind\n1,dwell\n'), 'steps.csv, row 1: the columns path, label,'],
    ['an empty step log', bare('steps.csv', ''), 'steps.csv: the file is empty'],
    ['a broken quote', steps('1,"1.dwell,dwell'), 'steps.csv, row 2: not readable as CSV'],
    [
      'a stretch without an end',
      bare('exclusions.csv', 'start_utc,end_utc,reason\n2026-03-01T22:00:00.000Z,,x\n'),
      'exclusions.csv, row 2, column end_utc: "" is not a UTC time',
    ],
    ['a rig that is not JSON', bare('rig.json', '{'), 'rig.json: not readable as JSON'],
    [
      'a quantity in another unit',
      bare('rig.json', JSON.stringify(smallArchiveInput().rig).replace('"kg"', '"g"')),
      /^rig\.json: .*ballMass\.unit|^rig\.json: .*unit/,
    ],
    [
      'a missing quantity',
      bare('rig.json', '{"pendulum": {}, "sources": {"shape": "sphere"}, "stations": {}}'),
      /^rig\.json: pendulum\.arm/,
    ],
    [
      'a registered method that there is not',
      bare('protocol.json', '{"formatVersion":1,"evaluation":{"method":"guess"}}'),
      /^protocol\.json: evaluation\.method/,
    ],
    ['a package that is not JSON', bare('datapackage.json', 'x'), 'datapackage.json: not readable as JSON'],
    [
      'a package of another format',
      bare('datapackage.json', '{"resources":[],"evenfall":{"formatVersion":2}}'),
      'datapackage.json: evenfall.formatVersion is 2',
    ],
    [
      'a resource outside the archive',
      bare('datapackage.json', '{"resources":[{"path":"../rig.json"}]}'),
      'datapackage.json: the resource path "../rig.json" must be relative',
    ],
  ])('%s', (_what, files, message) => {
    expect(() => read(files)).toThrow(message);
  });

  test.each([
    [
      'a time that goes back',
      '2026-03-01T22:00:01.000Z,1\n2026-03-01T22:00:00.900Z,1\n',
      'channels/deflection.csv, row 3, column time_utc: 2026-03-01T22:00:00.900Z is not later',
    ],
    ['a value that is NaN', '2026-03-01T22:00:01.000Z,NaN\n', 'channels/deflection.csv, row 2, column value: "NaN" is not a number'],
    ['an empty value', '2026-03-01T22:00:01.000Z,\n', 'channels/deflection.csv, row 2, column value: "" is not a number'],
    [
      'a value in another notation',
      '2026-03-01T22:00:01.000Z,0x10\n',
      'channels/deflection.csv, row 2, column value: "0x10" is not a number',
    ],
    [
      'a quotation mark that nothing closes',
      '2026-03-01T22:00:01.000Z,1\n2026-03-01T22:00:02.000Z,"1\n2026-03-01T22:00:03.000Z,1\n',
      'channels/deflection.csv, row 3: not readable as CSV: a quotation mark opens here',
    ],
    ['a decimal comma', '2026-03-01T22:00:01.000Z,1,5\n', 'channels/deflection.csv, row 2, column value: "1,5" is not a number'],
    ['a time of another kind', '1772402400,1\n', 'channels/deflection.csv, row 2, column time_utc: "1772402400" is not a UTC time'],
    ['half a row', '2026-03-01T22:00:01.000Z\n', 'channels/deflection.csv, row 2: "2026-03-01T22:00:01.000Z" is not a time and a value'],
  ])('%s', (_what, rows, message) => {
    const files = bare('channels/deflection.csv', `time_utc,value\n${rows}`);
    expect(() => read(files).readChannel('deflection')).toThrow(message);
  });

  test('a channel is read the same with quotes, with line ends of another system and with columns changed over', () => {
    const plain = 'time_utc,value\n2026-03-01T22:00:01.000Z,1.5\n2026-03-01T22:00:02.000Z,-2\n';
    const expected = read(bare('channels/deflection.csv', plain)).readChannel('deflection');
    for (const other of [
      plain.replaceAll('\n', '\r\n'),
      plain.replaceAll('1.5', '"1.5"'),
      `\uFEFF${plain}`,
      'value,time_utc\n1.5,2026-03-01T22:00:01.000Z\n-2,2026-03-01T22:00:02.000Z\n',
    ]) {
      expect(read(bare('channels/deflection.csv', other)).readChannel('deflection')).toEqual(expected);
    }
  });

  test('a channel that there is not is answered with those that there are', () => {
    const archive = read(buildArchive(smallArchiveInput(), sha256Hex));
    expect(() => archive.readChannel('tilt')).toThrow('there is no channel "tilt"; the archive holds "deflection", "box temperature"');
  });
});
