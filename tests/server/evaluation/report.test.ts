import { measurementReport } from '@/server/evaluation/report';
import type { ReportInput } from '@/server/interfaces/report';
import { night, alternatingAngles } from '../../support/night';
import { evaluateNight } from '../../support/evaluate-night';
import { normalDeviates } from '../../support/lcg';
import { wideRig, wideSourceAngleRad } from '../../support/reference-rigs';

const near = (wideSourceAngleRad * 180) / Math.PI;

function reportInput(swings = 7): ReportInput {
  const normal = normalDeviates(5);
  const plan = {
    rig: wideRig(),
    anglesDeg: alternatingAngles(swings, near, -near),
    dwellS: 830,
    reading: (angle: number) => angle + 1e-6 * normal(),
  };
  const { result, curves } = evaluateNight(plan, { besides: true });
  return {
    run: {
      id: 'run-1',
      rigName: 'Wide rig',
      rigRevision: 3,
      protocolName: 'Long night',
      protocolRevision: 2,
      massSet: 'lead spheres',
      operator: 'Ilse Marrowby',
      rehearsal: false,
      startedAtUtcMs: Date.UTC(2026, 2, 1, 22),
      endedAtUtcMs: Date.UTC(2026, 2, 2, 5),
    },
    rig: plan.rig,
    evaluation: { id: 'evaluation-1', at: '2026-03-02T06:00:00.000Z', by: 'Tam Ferrowdale', channel: 'deflection', software: '1.2.3' },
    frozen: { at: '2026-03-02T07:00:00.000Z', by: 'Tam Ferrowdale', reason: 'for the thesis' },
    result,
    curves,
    steps: night(plan).steps as ReportInput['steps'],
    excluded: [
      { startUtcMs: Date.UTC(2026, 2, 1, 23), endUtcMs: Date.UTC(2026, 2, 1, 23, 2), by: 'Ilse Marrowby', reason: 'the door was opened' },
    ],
    chainHead: 'ab'.repeat(32),
  };
}

/** The text of an uncompressed PDF whose fonts say which sign each glyph is. */
function textOf(pdf: Uint8Array): string {
  const source = Buffer.from(pdf).toString('latin1');
  const objects = new Map([...source.matchAll(/(\d+) 0 obj\n([\s\S]*?)endobj/g)].map(([, id = '', body = '']) => [id, body]));
  const mapOf = (fontId: string): Map<string, string> => {
    const unicode = /\/ToUnicode (\d+) 0 R/.exec(objects.get(fontId) ?? '')?.[1] ?? '';
    const signs = new Map<string, string>();
    for (const [, from = '', , list = ''] of (objects.get(unicode) ?? '').matchAll(/<([0-9a-f]+)> <([0-9a-f]+)> \[([^\]]*)\]/gi))
      [...list.matchAll(/<([0-9a-f ]*)>/gi)].forEach(([, hex = ''], k) => {
        const units = (hex.replaceAll(' ', '').match(/.{4}/g) ?? []).map((unit) => parseInt(unit, 16));
        signs.set((parseInt(from, 16) + k).toString(16).padStart(4, '0'), String.fromCharCode(...units));
      });
    return signs;
  };
  const fonts = new Map([...source.matchAll(/\/(F\d+) (\d+) 0 R/g)].map(([, name = '', id = '']) => [name, mapOf(id)]));
  let text = '';
  let signs = new Map<string, string>();
  for (const [, font, shown] of source.matchAll(/\/(F\d+) [\d.]+ Tf|\[([^\]]*)\] TJ/g)) {
    if (font !== undefined) signs = fonts.get(font) ?? new Map<string, string>();
    else
      text += `${[...(shown ?? '').matchAll(/<([0-9a-f]+)>/gi)]
        .flatMap(([, hex = '']) => hex.match(/.{4}/g) ?? [])
        .map((glyph) => signs.get(glyph) ?? '?')
        .join('')}\n`;
  }
  return text.replaceAll('\u202f', ' ');
}

test('the report tells G with its u and unit, the budget, the software and the head of the chain', async () => {
  const text = textOf(await measurementReport(reportInput(), { compress: false }));
  expect(text).toContain('Measurement report: Long night on Wide rig');
  expect(text).toMatch(/G = 6\.67\d* ?\d*\(\d+\) × 10⁻¹¹ m³ kg⁻¹ s⁻²/);
  for (const words of [
    'for the thesis',
    'Evenfall 1.2.3',
    'ab'.repeat(20),
    'near − far',
    'torsion constant κ',
    'Budget of uncertainty',
    'mrad',
    'µrad',
    'near − far at each reversal, mrad; line and band: the result ± u',
    'residuals as usual',
    'the greatest residuals',
    'data − fit, µrad',
    'overlapping Allan deviation, µrad, with ± u; dashed: white noise',
    'Excluded by hand',
    '2026-03-01 23:00:00 UTC',
    '120 s',
    'the door was opened',
  ])
    expect(text).toContain(words);
  expect(text).not.toContain('?');
});

test('where too few dwells tell the uncertainty, every value that lacks it says so, and there is no band', async () => {
  const input = reportInput(3);
  expect(input.result.G?.value).toBeGreaterThan(0);
  expect(input.result.G?.u).toBeNull();
  const text = textOf(await measurementReport({ ...input, excluded: [] }, { compress: false }));
  expect(text).toMatch(/G = 6\.6\d+ × 10⁻¹¹ m³ kg⁻¹ s⁻², u not known/);
  expect(text).toContain('No standard uncertainty can be given');
  expect(text).toMatch(/near − far\n[\d. ×⁻¹⁰³]+ rad, u not known/);
  expect(text).toContain('line: the result, its u is not known');
  expect(text).toContain('Only 3 dwells count');
  expect(text).not.toContain('line and band');
  expect(text).not.toContain('In brackets');
  expect(text).toContain('No samples were excluded by hand.');
});

test('the same evaluation gives the same bytes', async () => {
  const input = reportInput();
  const [one, other] = [await measurementReport(input), await measurementReport(input)];
  expect(Buffer.from(one).equals(Buffer.from(other))).toBe(true);
  expect(Buffer.from(one).toString('latin1', 0, 5)).toBe('%PDF-');
});
