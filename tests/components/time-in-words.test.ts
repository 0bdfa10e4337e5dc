import { expect, test } from 'vitest';
import { lengthInWords, relativeInWords, timeInWords, zoneInWords } from '@/components/ui/timeWords';

// London leaves summer time on the last Sunday of October at 01:00 UTC (Summer Time Order 2002).
const BEFORE_CHANGE = Date.UTC(2025, 9, 26, 0, 59, 59, 7);
const AFTER_CHANGE = Date.UTC(2025, 9, 26, 1, 0, 0, 412);

test('the hour that happens twice is told apart by its offset', () => {
  expect(timeInWords(BEFORE_CHANGE, 'millisecond', 'Europe/London')).toBe('26 Oct 2025 01:59:59.007');
  expect(zoneInWords(BEFORE_CHANGE, 'Europe/London')).toBe('UTC+01:00');
  expect(timeInWords(AFTER_CHANGE, 'millisecond', 'Europe/London')).toBe('26 Oct 2025 01:00:00.412');
  expect(zoneInWords(AFTER_CHANGE, 'Europe/London')).toBe('UTC');
});

test('midnight is 00:00 and never 24:00', () => {
  expect(timeInWords(Date.UTC(2025, 11, 1), 'minute')).toBe('1 Dec 2025 00:00');
});

test('the year is left out only where it is the present one', () => {
  const now = Date.UTC(2026, 0, 5);
  expect(timeInWords(Date.UTC(2026, 0, 1), 'date', 'UTC', now)).toBe('1 Jan');
  expect(timeInWords(Date.UTC(2025, 11, 31), 'date', 'UTC', now)).toBe('31 Dec 2025');
});

test('a moment is named by its largest unit, ahead or past, and by its date beyond a month', () => {
  const now = Date.UTC(2025, 11, 1, 12);
  const ago = (ms: number) => relativeInWords(now - ms, now);
  expect([ago(3_000), ago(40_000), ago(3 * 60_000), ago(2 * 3_600_000), ago(6 * 86_400_000)]).toEqual([
    'now',
    '40 s',
    '3 min',
    '2 h',
    '6 d',
  ]);
  expect(ago(-2 * 86_400_000)).toBe('in 2 d');
  expect(ago(31 * 86_400_000)).toBe('31 Oct');
});

test('a length is its two largest units', () => {
  expect([15_000, 200_000, 2 * 86_400_000 + 4 * 3_600_000, 3_600_000].map(lengthInWords)).toEqual([
    '15.0 s',
    '3 min 20 s',
    '2 d 4 h',
    '1 h',
  ]);
});
