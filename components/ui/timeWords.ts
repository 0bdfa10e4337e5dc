const MONTHS = ['Jan', 'Feb', 'Mar', 'Apr', 'May', 'Jun', 'Jul', 'Aug', 'Sep', 'Oct', 'Nov', 'Dec'];
const MINUTE = 60_000;
const HOUR = 60 * MINUTE;
const DAY = 24 * HOUR;

const formats = new Map<string, Intl.DateTimeFormat>();
// Numbers only: names of months and zones differ between versions of ICU, and server and browser must agree.
const numbersOf = (at: number, zone: string) => {
  let format = formats.get(zone);
  if (!format) {
    format = new Intl.DateTimeFormat('en-GB', {
      timeZone: zone,
      hourCycle: 'h23',
      year: 'numeric',
      month: 'numeric',
      day: 'numeric',
      hour: '2-digit',
      minute: '2-digit',
      second: '2-digit',
      timeZoneName: 'longOffset',
    });
    formats.set(zone, format);
  }
  const parts = Object.fromEntries(format.formatToParts(at).map(({ type, value }) => [type, value]));
  // Some versions of ICU say GMT, others GMT+00:00.
  const offset = (parts.timeZoneName ?? 'GMT').replace('GMT', '').replace('+00:00', '');
  return {
    year: Number(parts.year),
    day: Number(parts.day),
    month: MONTHS[Number(parts.month) - 1] ?? '',
    clock: `${parts.hour}:${parts.minute}`,
    seconds: parts.second ?? '00',
    zone: offset === '' ? 'UTC' : `UTC${offset.replace('-', '−')}`,
  };
};

export type TimeStyle = 'date' | 'minute' | 'second' | 'millisecond' | 'clock' | 'clock-second';

/**
 * One moment in the hospital's zone: `date` 1 Dec 2025, `minute` 1 Dec 2025 14:11, `second` 1 Dec 2025 14:11:50,
 * `millisecond` 14:11:50.412, `clock` 14:11, `clock-second` 14:11:50.
 *
 * @param at UTC milliseconds
 * @param now leaves the year out where it is this one
 */
export function timeInWords(at: number, style: TimeStyle, zone = 'UTC', now?: number): string {
  const parts = numbersOf(at, zone);
  const sameYear = now !== undefined && numbersOf(now, zone).year === parts.year;
  const date = `${parts.day} ${parts.month}${sameYear ? '' : ` ${parts.year}`}`;
  const milliseconds = String(((at % 1000) + 1000) % 1000).padStart(3, '0');
  switch (style) {
    case 'date':
      return date;
    case 'clock':
      return parts.clock;
    case 'clock-second':
      return `${parts.clock}:${parts.seconds}`;
    case 'minute':
      return `${date} ${parts.clock}`;
    case 'second':
      return `${date} ${parts.clock}:${parts.seconds}`;
    case 'millisecond':
      return `${date} ${parts.clock}:${parts.seconds}.${milliseconds}`;
  }
}

/** `UTC`, `UTC+01:00`: the hospital's offset at that moment. */
export const zoneInWords = (at: number, zone = 'UTC'): string => numbersOf(at, zone).zone;

/** "now", "40 s", "3 min", "2 h", "6 d" either way from now; a date beyond a month. */
export function relativeInWords(at: number, now: number, zone = 'UTC'): string {
  const away = Math.abs(now - at);
  const ahead = at > now;
  if (away < 10_000) return 'now';
  if (away >= 30 * DAY) return timeInWords(at, 'date', zone, now);
  const words =
    away < MINUTE
      ? `${Math.floor(away / 1000)} s`
      : away < HOUR
        ? `${Math.floor(away / MINUTE)} min`
        : away < DAY
          ? `${Math.floor(away / HOUR)} h`
          : `${Math.floor(away / DAY)} d`;
  return ahead ? `in ${words}` : words;
}

/** "2 d 4 h", "3 min 20 s", "15.0 s": a length of time in its two largest units. */
export function lengthInWords(milliseconds: number): string {
  if (milliseconds < MINUTE) return `${(milliseconds / 1000).toFixed(1)} s`;
  const units: [number, string][] = [
    [DAY, 'd'],
    [HOUR, 'h'],
    [MINUTE, 'min'],
    [1000, 's'],
  ];
  const first = units.findIndex(([size]) => milliseconds >= size);
  let left = milliseconds;
  const words: string[] = [];
  for (const [size, name] of units.slice(first, first + 2)) {
    const count = Math.floor(left / size);
    left -= count * size;
    if (count > 0) words.push(`${count} ${name}`);
  }
  return words.join(' ');
}
