export { ThemeProvider, useTheme } from './theme-provider';
export { themeNames, themes, type ThemeColors, type ThemeName } from './tokens';
