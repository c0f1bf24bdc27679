/** The three themes as hex strings, for drawing on SVG and canvas; classes use the same values from global.css. */

export const themeNames = ['dark', 'light', 'red'] as const;
export type ThemeName = (typeof themeNames)[number];

export const tokenNames = [
  'ink',
  'panel',
  'panel2',
  'line',
  'text',
  'dim',
  'faint',
  'lamp',
  'onLamp',
  'near',
  'far',
  'danger',
  'good',
] as const;
export type ThemeColors = Record<(typeof tokenNames)[number], string>;

/** `faint` is for marks and lines, never for words: it has 3:1 only. `danger` is tuned to 7:1 on ink and panel for Stop. */
export const themes: Record<ThemeName, ThemeColors> = {
  dark: {
    ink: '#0b0f15',
    panel: '#131a24',
    panel2: '#1a2330',
    line: '#263241',
    text: '#e9eef5',
    dim: '#9aa8ba',
    faint: '#66758a',
    lamp: '#f4b63f',
    onLamp: '#201500',
    near: '#3cc8b4',
    far: '#b39bff',
    danger: '#ff8a72',
    good: '#9bd66f',
  },
  light: {
    ink: '#f5f2ea',
    panel: '#fffdf8',
    panel2: '#efeadf',
    line: '#d8d0c0',
    text: '#1b2230',
    dim: '#556070',
    faint: '#7d8796',
    lamp: '#8a5a00',
    onLamp: '#fff8ea',
    near: '#00756a',
    far: '#5d3fc4',
    danger: '#992007',
    good: '#3c6e12',
  },
  red: {
    ink: '#070000',
    panel: '#120302',
    panel2: '#1c0604',
    line: '#3b100b',
    text: '#ff7a66',
    dim: '#d4523f',
    faint: '#a03a2b',
    lamp: '#ff8a70',
    onLamp: '#140202',
    near: '#ff9580',
    far: '#e0503c',
    danger: '#ffb3a3',
    good: '#ff9580',
  },
};
