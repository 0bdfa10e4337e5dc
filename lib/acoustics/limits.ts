/**
 * Where published nomenclature draws its lines. Bellkeep stores hertz and milliseconds and names a class only with its
 * source; sources disagree, so each is said. These are places to listen, never diagnoses.
 */
interface ToneLimit {
  source: string;
  longerThanSeconds: number;
  fromHz: number;
  words: string;
}

const TONE_LIMITS: readonly ToneLimit[] = [
  // American Thoracic Society nomenclature, as tabulated in PMC7152492, table 16-2.
  { source: 'ATS', longerThanSeconds: 0.25, fromHz: 400, words: '250 ms, 400 Hz or more' },
  // CORSA guidelines, as summarised in the literature (read second hand).
  { source: 'CORSA', longerThanSeconds: 0.1, fromHz: 100, words: '100 ms, above 100 Hz' },
];

/** Which side of each published limit a continuous tone falls on, in words with the source. */
export function sideOfPublishedLimits(tone: { durationSeconds: number; frequencyHz: number }): string[] {
  return TONE_LIMITS.map(({ source, longerThanSeconds, fromHz, words }) => {
    const within = tone.durationSeconds > longerThanSeconds && tone.frequencyHz >= fromHz;
    return `${within ? 'over' : 'not over'} ${words} (${source})`;
  });
}
