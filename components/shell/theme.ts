/** Day, night, or as the system says. Kept in a cookie so that the server draws the first frame in the right one. */
export const THEMES = ['day', 'night', 'system'] as const;
export type Theme = (typeof THEMES)[number];
export const THEME_COOKIE = 'bellkeep-theme';

export const themeOf = (value: string | undefined): Theme =>
  THEMES.find((theme) => theme === value) ?? 'system';
