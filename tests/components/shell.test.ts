import { expect, test } from 'vitest';
import { passageInWords, segmentsOf } from '@/components/custody/PassageStrip';
import { currentRoom, roomsOf } from '@/components/shell/rooms';
import { themeOf } from '@/components/shell/theme';
import { hrefWith } from '@/components/ui/address';

test('a page that rooms share stands in the first of them that a person may enter', () => {
  const at = (path: string, ...roles: Parameters<typeof roomsOf>[0]) => currentRoom(path, roomsOf(roles))?.id;
  expect(at('/recordings/7K3F-92QX', 'clinician')).toBe('bedside');
  expect(at('/recordings/7K3F-92QX', 'auditor')).toBe('ledger');
  expect(at('/devices/1', 'itadmin')).toBe('bench');
  expect(at('/benchmark', 'biomed')).toBeUndefined();
  expect(at('/keyroom/people', 'itadmin')).toBe('keyroom');
});

test('the address keeps what was not changed, and loses what was emptied', () => {
  const search = { ward: ['alder', 'birch'], after: 'x', q: 'HM' };
  expect(hrefWith('/bench', search, { after: null, q: '', sort: '-tag' })).toBe(
    '/bench?ward=alder&ward=birch&sort=-tag',
  );
  expect(hrefWith('/bench', new URLSearchParams('a=1'), { a: null })).toBe('/bench');
});

test('an unknown theme in the cookie is the system’s', () => {
  expect([themeOf('night'), themeOf('"><script>'), themeOf(undefined)]).toEqual([
    'night',
    'system',
    'system',
  ]);
});

test('a strip shows what was reached, what is under way, and where it was cut', () => {
  const letters = (...passage: Parameters<typeof segmentsOf>) =>
    segmentsOf(...passage)
      .map((segment) => segment[0])
      .join('');
  expect(letters(null)).toBe('ooooo');
  expect(letters('awaited')).toBe('noooo');
  expect(letters('received')).toBe('ddnoo');
  expect(letters('received', true)).toBe('ddcoo');
  expect(letters('measured')).toBe('ddddo');
  expect(letters('filed')).toBe('ddddd');
});

test('a strip says in words what it draws', () => {
  expect(passageInWords('filed', false, 'repeat')).toBe('Filed, record again');
  expect(passageInWords('sealed', true)).toBe('Stopped after sealed');
});
