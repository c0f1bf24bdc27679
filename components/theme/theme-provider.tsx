import { createContext, useContext, useEffect, useMemo, useState, type ReactNode } from 'react';
import { readChosenTheme, showTheme, storeChosenTheme, usualTheme } from './theme-storage';
import { themes, type ThemeColors, type ThemeName } from './tokens';

interface Theme {
  name: ThemeName;
  /** Hex strings of the present theme, for SVG and canvas. */
  colors: ThemeColors;
  /** Whether the theme was chosen on this device. */
  chosen: boolean;
  choose: (name: ThemeName) => void;
}

const ThemeContext = createContext<Theme>({ name: 'dark', colors: themes.dark, chosen: false, choose: () => undefined });

/** The present theme and the way to choose another. */
export const useTheme = (): Theme => useContext(ThemeContext);

/** Holds the theme of this device: the chosen one, else dark. */
export function ThemeProvider({ children }: { children: ReactNode }) {
  const [chosen, setChosen] = useState<ThemeName | null>(readChosenTheme);
  const name = chosen ?? usualTheme;

  useEffect(() => showTheme(name, themes[name].ink), [name]);

  const theme = useMemo<Theme>(
    () => ({
      name,
      colors: themes[name],
      chosen: chosen !== null,
      choose: (next) => {
        storeChosenTheme(next);
        setChosen(next);
      },
    }),
    [name, chosen],
  );
  return <ThemeContext.Provider value={theme}>{children}</ThemeContext.Provider>;
}
