import { readFileSync } from 'node:fs';
import { join } from 'node:path';
import { themes, tokenNames, type ThemeColors, type ThemeName } from '@/components/theme/tokens';

const css = readFileSync(join(__dirname, '../../../global.css'), 'utf8');
const script = readFileSync(join(__dirname, '../../../public/theme.js'), 'utf8');
const ground = readFileSync(join(__dirname, '../../../public/ground.css'), 'utf8');

/** Relative luminance and contrast ratio of WCAG 2.2. */
function luminance(hex: string): number {
  const [r = 0, g = 0, b = 0] = [1, 3, 5]
    .map((at) => parseInt(hex.slice(at, at + 2), 16) / 255)
    .map((c) => (c <= 0.04045 ? c / 12.92 : ((c + 0.055) / 1.055) ** 2.4));
  return 0.2126 * r + 0.7152 * g + 0.0722 * b;
}
function contrast(a: string, b: string): number {
  const [hi = 0, lo = 0] = [luminance(a), luminance(b)].sort((x, y) => y - x);
  return (hi + 0.05) / (lo + 0.05);
}
const lowest = (colors: ThemeColors, token: keyof ThemeColors, grounds: readonly (keyof ThemeColors)[]) =>
  Math.min(...grounds.map((each) => contrast(colors[token], colors[each])));

const names = Object.keys(themes) as ThemeName[];

test('the contrast of black on white is 21, as WCAG defines it', () => {
  expect(contrast('#000000', '#ffffff')).toBeCloseTo(21, 6);
});

describe.each(names)('the theme %s', (name) => {
  const colors = themes[name];

  test('has the same values in the style sheet as for drawing', () => {
    const block = new RegExp(`\\.theme-${name} \\{([^}]*)\\}`).exec(css)?.[1] ?? '';
    for (const token of tokenNames) {
      const variable = token === 'onLamp' ? 'on-lamp' : token;
      const channels = new RegExp(`--${variable}: (\\d+) (\\d+) (\\d+);`).exec(block)?.slice(1).map(Number) ?? [];
      expect({ token, hex: `#${channels.map((c) => c.toString(16).padStart(2, '0')).join('')}` }).toEqual({ token, hex: colors[token] });
    }
  });

  test('shows its ground before the application has loaded', () => {
    expect(script).toContain(`${name}: '${colors.ink}'`);
    for (const token of ['ink', 'text', 'dim', 'line', 'lamp', 'near'] as const) expect(ground).toContain(`: ${colors[token]};`);
  });

  test.each(['text', 'dim', 'lamp', 'near', 'far', 'danger', 'good'] as const)('has 4.5:1 for words in %s on every ground', (token) => {
    expect(lowest(colors, token, ['ink', 'panel', 'panel2'])).toBeGreaterThanOrEqual(4.5);
  });

  test('has 7:1 for Stop, 4.5:1 on amber, 3:1 for marks', () => {
    expect(lowest(colors, 'danger', ['ink', 'panel'])).toBeGreaterThanOrEqual(7);
    expect(contrast(colors.onLamp, colors.lamp)).toBeGreaterThanOrEqual(4.5);
    expect(lowest(colors, 'faint', ['ink', 'panel'])).toBeGreaterThanOrEqual(3);
  });
});
