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
