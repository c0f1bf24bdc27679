import { fireEvent, screen } from '@testing-library/react';
import { readWantedU } from '@/components/protocols/night-words';
import { openEditor } from '../support/editor-page';

beforeEach(() => {
  window.localStorage.clear();
  jest.useFakeTimers();
});
afterEach(() => jest.useRealTimers());

test.each([
  ['0.4', 0.004],
  ['0,4', 0.004],
  [' 2 % ', 0.02],
  ['3e-2', 0.0003],
])('a wanted u of "%s" is read as %d of G', (text, share) => {
  const read = readWantedU(text);
  expect(read !== null && 'share' in read ? read.share : null).toBeCloseTo(share, 12);
});

const refused: [string, string][] = [
  ['0', 'above 0'],
  ['-0.4', 'above 0'],
  ['\u22120.4', 'above 0'],
  ['much', 'no number'],
  ['0.4 0.5 ppm', 'no number'],
  ['NaN', 'no number'],
  ['100', '100 % or more'],
  ['250', '100 % or more'],
];

test.each(refused)('"%s" is refused and says what would be right', (text, words) => {
  const read = readWantedU(text);
  expect(read !== null && 'wrong' in read ? read.wrong : null).toContain(words);
  expect(read !== null && 'wrong' in read ? read.wrong : null).toContain('for example 0.4');
});

test('nothing written is nothing wrong', () => expect(readWantedU('  ')).toBeNull());

test('the editor tells the pairs of a wanted u, and of bad input what would be right', async () => {
  await openEditor();
  const field = screen.getByTestId('wanted-u');
  const type = (value: string) => fireEvent.change(field, { target: { value } });
  const told = () => screen.getByTestId('wanted-pairs').textContent;
  type('0.41');
  expect(told()).toMatch(/^\d+ pairs? at this beat/);
  for (const [text, words] of refused) {
    type(text);
    const wrong = screen.getByText((content) => content.includes(words));
    // Said beside the field, to those who do not see it too, and nothing of pairs meanwhile.
    expect(field.getAttribute('aria-invalid')).toBe('true');
    expect((field.getAttribute('aria-describedby') ?? '').split(' ')).toContain(wrong.id);
    expect(told()).toBe('Tells how many pairs it takes at the beat of this plan.');
  }
  type('0.001');
  expect(told()).toContain('No number of pairs comes so far');
  expect(field.getAttribute('aria-invalid')).not.toBe('true');
});
