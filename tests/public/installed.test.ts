import { readFileSync } from 'node:fs';
import { join } from 'node:path';
import { themes } from '@/components/theme/tokens';

const folder = join(__dirname, '../../public');
const text = (name: string) => readFileSync(join(folder, name), 'utf8');

interface Manifest {
  name: string;
  start_url: string;
  background_color: string;
  theme_color: string;
  icons: { src: string; sizes: string; type: string; purpose: string }[];
}
const manifest = JSON.parse(text('manifest.webmanifest')) as Manifest;

/** Width and height out of the header of a PNG (PNG specification, 11.2.2 IHDR). */
function pngSize(bytes: Buffer): string {
  expect(bytes.subarray(1, 4).toString('latin1')).toBe('PNG');
  return `${String(bytes.readUInt32BE(16))}x${String(bytes.readUInt32BE(20))}`;
}

test('the manifest names icons that are there in the sizes it says, one of them to be cut round', () => {
  for (const { src, sizes, type } of manifest.icons) {
    const bytes = readFileSync(join(folder, src));
    if (type === 'image/png') expect(pngSize(bytes)).toBe(sizes);
  }
  expect(manifest.icons.map(({ sizes, purpose }) => `${sizes} ${purpose}`)).toEqual(
    expect.arrayContaining(['192x192 any', '512x512 any', '512x512 maskable']),
  );
});

test('nothing is white before the first paint: the manifest has the ground of the dark theme, and the pages name it', () => {
  expect([manifest.background_color, manifest.theme_color]).toEqual([themes.dark.ink, themes.dark.ink]);
  for (const page of ['index.html', 'offline.html'])
    expect(text(page)).toContain(`<meta name="theme-color" content="${themes.dark.ink}" />`);
  expect(text('index.html')).toContain('<link rel="manifest" href="/manifest.webmanifest" />');
});

test.each(Object.entries(themes))('the offline page has the colours of the theme %s', (name, colors) => {
  const css = text('offline.css');
  const block = name === 'dark' ? /^\.away \{([\s\S]*?)\}/m.exec(css) : new RegExp(`\\.theme-${name} \\.away \\{([\\s\\S]*?)\\}`).exec(css);
  for (const [variable, token] of [
    ['raised', 'panel'],
    ['ink', 'onLamp'],
    ['danger', 'danger'],
  ] as const)
    expect(block?.[1]).toContain(`--${variable}: ${colors[token]};`);
});

test('the offline page says what goes on without it and how to stop at the rig, and offers nothing that would be sent later', () => {
  const page = text('offline.html').replace(/\s+/g, ' ');
  expect(page).toContain('A run goes on by itself');
  expect(page).toContain('Use the switch at the rig');
  expect(page.match(/<button/g)).toHaveLength(1);
  const sent = [...text('offline.js').matchAll(/fetch\('([^']*)'/g)].map(([, address]) => address);
  expect(sent).toEqual(['/api/health']);
});
