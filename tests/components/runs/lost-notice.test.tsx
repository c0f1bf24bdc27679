import { render, screen } from '@testing-library/react';
import { LostNotice } from '@/components/runs/link-chip';

/** What the run page says over its whole width when it no longer knows the rig. */

const age = { grade: 'lost', ageS: 12, silent: 'rig' } as const;
const words = () => screen.getByTestId('lost-notice').textContent ?? '';
const notDriven = 'No process drives this rig at the moment. Use the switch at the rig if anything moves.';

test('it says that nobody drives the rig, in place of a controller that is silent', () => {
  const { rerender } = render(<LostNotice age={age} notDriven={undefined} />);
  expect(words()).toContain('The server hears nothing from the controller.');
  rerender(<LostNotice age={age} notDriven={notDriven} />);
  expect(words()).toContain('12');
  expect(words()).toContain(notDriven);
  expect(words()).not.toContain('hears nothing from the controller');
});

test('where the page itself hears nothing it says no more than that', () => {
  render(<LostNotice age={{ ...age, silent: 'page' }} notDriven={notDriven} />);
  expect(words()).toContain('Nothing heard from the server.');
  expect(words()).not.toContain(notDriven);
});
