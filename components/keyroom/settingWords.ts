/** One decided value in words: "90 days", "yes". */
export const settingWords = (value: number | boolean | undefined, unit = ''): string => {
  if (typeof value === 'boolean') return value ? 'yes' : 'no';
  return value === undefined ? 'not set' : `${value.toLocaleString('en-GB')} ${unit}`.trim();
};
