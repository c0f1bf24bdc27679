const token = (name) => `rgb(var(--${name}) / <alpha-value>)`;
const colors = Object.fromEntries(
  ['ink', 'panel', 'panel2', 'line', 'text', 'dim', 'faint', 'lamp', 'on-lamp', 'near', 'far', 'danger', 'good'].map((name) => [
    name,
    token(name),
  ]),
);

/** @type {import('tailwindcss').Config} */
module.exports = {
  content: ['./app/**/*.{ts,tsx}', './components/**/*.{ts,tsx}'],
  presets: [require('nativewind/preset')],
  darkMode: 'class',
  // A tap leaves a hover behind on a phone, and the last pressed button would look chosen.
  future: { hoverOnlyWhenSupported: true },
  theme: {
    extend: {
      colors,
      fontFamily: {
        sans: ['Atkinson Hyperlegible Next', 'system-ui', 'sans-serif'],
        mono: ['Atkinson Hyperlegible Mono', 'ui-monospace', 'monospace'],
      },
      borderRadius: { panel: '14px', action: '16px' },
      screens: { wide: '1024px' },
      minHeight: { target: '48px', action: '64px' },
      minWidth: { target: '48px' },
    },
    fontWeight: { thin: '300', regular: '400', medium: '500', strong: '650' },
    fontSize: {
      13: ['13px', '18px'],
      15: ['15px', '21px'],
      17: ['17px', '24px'],
      20: ['20px', '26px'],
      24: ['24px', '30px'],
      30: ['30px', '36px'],
      44: ['44px', '50px'],
      60: ['60px', '64px'],
    },
  },
};
