import { fireEvent, render, screen } from '@testing-library/react';
import { ImportSheet } from '@/components/protocols/import-sheet';

const taken = jest.fn();
beforeEach(() => {
  taken.mockClear();
  render(<ImportSheet onDocument={taken} onClose={() => undefined} />);
});

const read = (text: string) => {
  fireEvent.change(screen.getByTestId('import-text'), { target: { value: text } });
  fireEvent.click(screen.getByTestId('import-read'));
};
const alert = () => screen.getByRole('alert').textContent ?? '';

test('a text that is no JSON is refused with line and column, and stays', () => {
  read('{\n  "formatVersion": 1,\n  "name": "x",,\n}');
  expect(alert()).toMatch(/Line 3, column 15/);
  expect((screen.getByTestId('import-text') as HTMLTextAreaElement).value).toContain('"name": "x",,');
  expect(taken).not.toHaveBeenCalled();
});

test('each thing that does not fit the format is named with the path of its step', () => {
  read(
    JSON.stringify({
      formatVersion: 1,
      name: 'x',
      steps: [{ kind: 'home' }, { kind: 'repeat', times: 0, steps: [{ kind: 'swing', too: 'near' }] }],
    }),
  );
  expect(alert()).toContain('2.repeat');
  expect(alert()).toContain('2.repeat.1.swing');
  expect(alert()).toContain('"too"');
  expect(taken).not.toHaveBeenCalled();
});

test('a protocol is taken as it is', () => {
  const document = { formatVersion: 1, name: 'One swing', steps: [{ kind: 'home' }, { kind: 'swing', to: 'near' }] };
  read(JSON.stringify(document));
  expect(taken).toHaveBeenCalledWith(document);
});
