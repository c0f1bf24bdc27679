export { ThemeProvider, useTheme } from './theme-provider';
export { themes, type ThemeColors, type ThemeName } from './tokens';
