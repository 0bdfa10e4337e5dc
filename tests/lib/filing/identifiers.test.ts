import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { dateAsWritten, identifiersMatch } from '@/lib/filing/identifiers';

const freya = { recordNumber: 'HGH-204-7718', familyName: 'Mbeki-Tran', birthDate: '1951-03-14' };
const matches = (recordNumber: string, second: string, who: typeof freya = freya): boolean =>
  identifiersMatch({ recordNumber, second }, who);

// Two identifiers are read before filing: common practice, no source.
describe('two identifiers', () => {
  test.each([
    ['HGH-204-7718', 'Mbeki-Tran'],
    ['hgh 204 7718', 'mbeki tran'],
    ['HGH2047718', 'MBEKITRAN'],
    ['HGH-204-7718', '1951-03-14'],
    ['HGH-204-7718', '14 Mar 1951'],
    ['HGH-204-7718', '14.3.1951'],
  ])('are the patient’s when read as %s and %s', (recordNumber, second) => {
    expect(matches(recordNumber, second)).toBe(true);
  });

  test.each([
    ['another patient’s number with the right name', 'HGH-204-7719', 'Mbeki-Tran'],
    ['the right number with another name', 'HGH-204-7718', 'Mbeki'],
    ['the right number with another date', 'HGH-204-7718', '1951-03-15'],
    ['the right number with the year alone', 'HGH-204-7718', '1951'],
    ['the right number twice', 'HGH-204-7718', 'HGH-204-7718'],
    ['a date with day and month changed round', 'HGH-204-7718', '3.14.1951'],
    ['nothing but signs', '---', '---'],
  ])('are not the patient’s with %s', (_what, recordNumber, second) => {
    expect(matches(recordNumber, second)).toBe(false);
  });

  test.each([
    ['Sørensen', 'Sorensen'],
    ['Łukasiewicz', 'Lukasiewicz'],
    ['Weiß', 'WEISS'],
    ['Núñez', 'nunez'],
    ['O’Brien', "O'BRIEN"],
  ])('match %s typed as %s', (familyName, second) => {
    expect(matches('HGH-204-7718', second, { ...freya, familyName })).toBe(true);
  });

  test('a name without a letter matches nothing, not even itself', () => {
    expect(matches('HGH-204-7718', '—', { ...freya, familyName: '—' })).toBe(false);
  });

  test('a birth date that is known only in part identifies nobody, and the name still does', () => {
    const partly = { ...freya, birthDate: '1951' };
    expect(matches('HGH-204-7718', '1951', partly)).toBe(false);
    expect(matches('HGH-204-7718', 'Mbeki-Tran', partly)).toBe(true);
  });

  test('a birth date is recognised however its day is written, and no other day is taken for it', () => {
    const day = fc
      .date({ min: new Date('1900-01-01'), max: new Date('2099-12-31'), noInvalidDate: true })
      .map((date) => date.toISOString().slice(0, 10));
    const written = (iso: string): string[] => {
      const [year = '', month = '', date = ''] = iso.split('-');
      const name = new Date(`${iso}T00:00:00Z`).toLocaleString('en-GB', { month: 'long', timeZone: 'UTC' });
      return [
        iso,
        `${year}${month}${date}`,
        `${Number(date)}.${Number(month)}.${year}`,
        `${date}/${month}/${year}`,
        `${date}-${month}-${year}`,
        `${Number(date)} ${name} ${year}`,
        `${date} ${name.slice(0, 3).toUpperCase()} ${year}`,
      ];
    };
    fc.assert(
      fc.property(day, day, (right, other) => {
        for (const text of written(right)) expect(dateAsWritten(text)).toBe(right);
        if (right !== other) for (const text of written(other)) expect(dateAsWritten(text)).not.toBe(right);
      }),
    );
  });

  test.each(['', 'yesterday', '14 Foo 1951', '1951-3-14-2', '14.3.51'])('%j is no date', (text) => {
    expect(dateAsWritten(text)).toBeNull();
  });
});
