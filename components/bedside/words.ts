const MONTHS = ['Jan', 'Feb', 'Mar', 'Apr', 'May', 'Jun', 'Jul', 'Aug', 'Sep', 'Oct', 'Nov', 'Dec'];

/** A FHIR date, whole or partial, in words: "14 Mar 1951", "Mar 1951", "1951"; or that it is not known. */
export function bornInWords(date: string | null): string {
  const match = /^(\d{4})(?:-(\d{2}))?(?:-(\d{2}))?$/.exec(date ?? '');
  if (!match) return 'not known';
  const [, year, month, day] = match;
  return [day ? String(Number(day)) : null, month ? MONTHS[Number(month) - 1] : null, year]
    .filter(Boolean)
    .join(' ');
}

export const nameOf = (who: { givenName: string; familyName: string }): string =>
  `${who.givenName} ${who.familyName}`;

/** As lists have it, family name first. */
export const listNameOf = (who: { givenName: string; familyName: string }): string =>
  `${who.familyName}, ${who.givenName}`;

/** "1 clip", "3 clips". */
export const counted = (count: number, one: string, many = `${one}s`): string =>
  `${count.toLocaleString('en-GB')} ${count === 1 ? one : many}`;

/** "Alder", "Alder and Birch", "Alder, Birch and Cedar". */
export const joined = (names: readonly string[]): string =>
  names.length < 2 ? (names[0] ?? '') : `${names.slice(0, -1).join(', ')} and ${names.at(-1)}`;
