import { sniffCsv, unitOf } from '@/server/ingest/csv-sniff';

const sniff = (text: string) => sniffCsv(Buffer.from(text), true);

describe('the guess at how a CSV is to be read', () => {
  it('takes comma, point, header, ISO time and the unit in the name', () => {
    const { mapping, ambiguous, columns } = sniff(
      'time_utc,deflection_urad\n2031-03-14T22:00:00.000Z,12.5\n2031-03-14T22:00:00.100Z,12.6\n',
    );
    expect(mapping).toEqual({
      delimiter: ',',
      decimal: '.',
      headerRow: true,
      timeColumn: 0,
      timeFormat: 'iso',
      valueColumn: 1,
      unit: 'urad',
    });
    expect(ambiguous).toEqual([]);
    expect(columns).toEqual([
      { index: 0, name: 'time_utc', sample: '2031-03-14T22:00:00.000Z' },
      { index: 1, name: 'deflection_urad', sample: '12.5' },
    ]);
  });

  it('takes semicolons with the decimal comma', () => {
    const { mapping, ambiguous } = sniff('t [s];Winkel;spot (mm)\n0,0;1;12,50\n0,1;1;12,61\n');
    expect(mapping).toMatchObject({ delimiter: ';', decimal: ',', timeFormat: 'elapsed-s', valueColumn: 2, unit: 'mm' });
    expect(ambiguous).toEqual(['elapsedFrom']);
  });

  it('takes tabs, bars and spaces', () => {
    expect(sniff('1931724000\t1.5e-5\n1931724001\t1.6e-5\n').mapping.delimiter).toBe('\t');
    expect(sniff('1931724000|1.5\n1931724001|1.6\n').mapping.delimiter).toBe('|');
    expect(sniff('1931724000 1.5\n1931724001 1.6\n').mapping.delimiter).toBe(' ');
    expect(sniff('1931724000, 1.5\n1931724001, 1.6\n').mapping.delimiter).toBe(',');
  });

  it('tells seconds since 1970 from milliseconds and from seconds elapsed', () => {
    expect(sniff('time,theta_rad\n1931724000.25,0.1\n1931724001.25,0.2\n').mapping.timeFormat).toBe('epoch-s');
    expect(sniff('time,theta_rad\n1931724000250,0.1\n1931724001250,0.2\n').mapping.timeFormat).toBe('epoch-ms');
    expect(sniff('time,theta_rad\n0.25,0.1\n1.25,0.2\n').mapping.timeFormat).toBe('elapsed-s');
  });

  it('lists what it cannot tell instead of guessing', () => {
    expect(sniff('time,a,b\n1931724000,0.1,5\n1931724001,0.2,6\n').ambiguous).toEqual(['valueColumn', 'unit']);
    expect(sniff('time;theta_urad\n1931724000;1,234\n1931724001;1,236\n').ambiguous).toEqual(['decimal']);
    expect(sniff('time,theta_urad\n2031-03-14 22:00:00,1\n2031-03-14 22:00:01,2\n').ambiguous).toEqual(['timesWithoutZoneAreUtc']);
    expect(sniff('time,theta_urad\n2031-03-14T22:00:00Z,1\n1931724001,2\n').ambiguous).toContain('timeFormat');
    expect(sniff('03/04/2031 22:00,1\n03/04/2031 22:01,2\n').ambiguous).toContain('timeFormat');
  });

  it('passes over a byte order mark, comments and blank lines', () => {
    const { mapping, rows } = sniff('\ufeff# made by hand\n\ntime_utc,theta_mrad\r\n2031-03-14T22:00:00Z,1\r\n');
    expect(mapping).toMatchObject({ headerRow: true, unit: 'mrad' });
    expect(rows).toEqual([
      ['time_utc', 'theta_mrad'],
      ['2031-03-14T22:00:00Z', '1'],
    ]);
  });

  it.each([
    ['', 'The file is empty.'],
    ['just words\nand more words here\n', 'No table was found'],
    ['time,theta\n', 'no row of data'],
    ['PK\u0003\u0004\0\0', 'zero bytes'],
  ])('refuses %j saying %s', (text, words) => {
    expect(() => sniff(text)).toThrow(words);
  });

  const table = 'Zeit;Ausschlag (µrad)\n2031-03-14T22:00:00Z;1,5\n2031-03-14T22:00:01Z;2,5\n';
  it.each([
    ['UTF-8 with its mark', Buffer.from(`\ufeff${table}`), undefined],
    ['UTF-16, little-endian, with its mark', Buffer.from(`\ufeff${table}`, 'utf16le'), 'utf-16le'],
    ['UTF-16, little-endian, without', Buffer.from(table, 'utf16le'), 'utf-16le'],
    ['UTF-16, big-endian', Buffer.from(`\ufeff${table}`, 'utf16le').swap16(), 'utf-16be'],
    ['Latin-1', Buffer.from(table, 'latin1'), 'latin-1'],
  ])('reads %s', (_name, bytes, encoding) => {
    const { mapping, columns } = sniffCsv(bytes, true);
    expect(mapping.encoding).toBe(encoding);
    expect(mapping).toMatchObject({ delimiter: ';', decimal: ',', unit: 'urad', headerRow: true });
    expect(columns.map(({ name }) => name)).toEqual(['Zeit', 'Ausschlag (µrad)']);
  });

  it('tries a rare sign between the columns where no usual one parts them', () => {
    expect(sniff('time^theta_rad\n1931724000^1\n1931724001^2\n').mapping.delimiter).toBe('^');
  });

  it('takes no picture for a table', () => {
    expect(() => sniffCsv(Buffer.from([0x89, 0x50, 0x4e, 0x47, 0x0d, 0x0a, 0x1a, 0x0a]), true)).toThrow('control codes');
  });

  it('does not mind a character cut in two at the end of the first bytes', () => {
    const bytes = Buffer.from('time,theta_µrad\n1931724000,1\n1931724001,2\n# µ');
    expect(sniffCsv(bytes.subarray(0, -1), false).mapping.unit).toBe('urad');
  });

  it.each([
    ['deflection (µrad)', 'urad'],
    ['deflection [μrad]', 'urad'],
    ['theta_rad', 'rad'],
    ['spot mm', 'mm'],
    ['position/m', 'm'],
    ['angle (mrad)', 'mrad'],
    ['deflection', null],
    ['form', null],
    ['temperature_K', null],
  ])('reads the unit of %j as %s', (name, unit) => {
    expect(unitOf(name)).toBe(unit);
  });
});
