import type { Finding } from './types';

/** A finding for people: what it is, what it means for listening, what to do. Made from the code, never stored. */
export interface FindingSentence {
  title: string;
  meaning: string;
  action: string;
}

const percent = (fraction: number | undefined): string => {
  const value = (fraction ?? 0) * 100;
  return `${value >= 10 ? value.toFixed(0) : value >= 1 ? value.toFixed(1) : value.toFixed(2)} %`;
};
const seconds = (value: number | undefined): string => `${(value ?? 0).toFixed((value ?? 0) < 1 ? 2 : 1)} s`;
const db = (value: number | undefined): string => `${(value ?? 0).toFixed(1).replace('-', '−')} dB`;
const hertz = (value: number | undefined): string => `${Math.round(value ?? 0).toLocaleString('en-GB')} Hz`;

type Loose = Pick<Finding, 'severity'> & {
  code: string;
  value?: number | undefined;
  unit?: string | undefined;
  threshold?: number | undefined;
  channel?: number | undefined;
};

const AGAIN = 'Record again.';
const SENTENCES: Record<string, (f: Loose) => FindingSentence> = {
  unreadable: () => ({
    title: 'Not readable',
    meaning: 'Nothing could make sound of this file.',
    action: `${AGAIN} If it happens twice, take the device to biomedical engineering.`,
  }),
  empty: () => ({
    title: 'Empty',
    meaning: 'The file holds no sound.',
    action: `${AGAIN} Keep the chestpiece on until the device says it is done.`,
  }),
  truncated: (f) => ({
    title: 'Cut short',
    meaning: `${seconds(f.value)} at the end did not arrive.`,
    action: f.severity === 'repeat' ? AGAIN : 'What is there can be relied on.',
  }),
  'container-odd': () => ({
    title: 'File irregular',
    meaning: 'The file’s wrapping has a harmless irregularity; the sound is whole.',
    action: 'Nothing to do.',
  }),
  'type-mismatch': () => ({
    title: 'Announced as another type',
    meaning: 'The file is of another kind than the device announced.',
    action: 'Tell biomedical engineering; the sound is not affected.',
  }),
  lossy: () => ({
    title: 'Lossy codec',
    meaning: 'The sound was compressed with loss; quiet sounds may be missing.',
    action: 'Listen with that in mind. Biomedical engineering should set the device to WAV or FLAC.',
  }),
  'rate-unexpected': (f) => ({
    title: 'Wrong sample rate',
    meaning: `Recorded at ${hertz(f.value)}; this model sends ${hertz(f.threshold)}.`,
    action: `${AGAIN} If it stays, take the device to biomedical engineering.`,
  }),
  'bandwidth-limited': (f) => ({
    title: 'Narrow bandwidth',
    meaning: `There is no sound above ${hertz(f.value)}.`,
    action: f.severity === 'care' ? 'Check the device’s filter setting.' : 'Noted.',
  }),
  'too-short': (f) => ({
    title: 'Too short',
    meaning: `${seconds(f.value)} is shorter than the ${seconds(f.threshold)} that are needed.`,
    action: `${AGAIN} Hold the chestpiece still a little longer.`,
  }),
  'too-short-for-rates': (f) => ({
    title: 'Short',
    meaning: `${seconds(f.value)} is too short to estimate a breath rate.`,
    action: 'Noted.',
  }),
  silent: () => ({
    title: 'No sound',
    meaning: 'There is nothing above the device’s own noise.',
    action: `${AGAIN} Check that the chestpiece is turned to the side in use and lies flat.`,
  }),
  'level-low': (f) => ({
    title: 'Quiet',
    meaning: `The sound is low (${db(f.value)}FS). Quiet breath sounds may be the finding.`,
    action: 'Press a little firmer or turn the gain up one step, if the patient allows.',
  }),
  clipped: (f) => ({
    title: 'Clipped',
    meaning:
      f.severity === 'repeat'
        ? `The sound is cut off at the top for ${percent(f.value)} of the clip.`
        : `A few tops are cut off (${percent(f.value)}). The rest can be relied on.`,
    action:
      f.severity === 'repeat'
        ? 'Turn the gain down one step and record again.'
        : 'Turn the gain down one step next time.',
  }),
  'flat-topped': (f) => ({
    title: 'Flat tops',
    meaning: `The loudest parts were cut at ${db(f.value)}FS before the file was made.`,
    action: 'Turn the gain down one step next time.',
  }),
  'over-full-scale': () => ({
    title: 'Over full scale',
    meaning: 'Some samples are above full scale; they are kept as they are.',
    action: 'Noted.',
  }),
  'dc-offset': (f) => ({
    title: 'DC offset',
    meaning: `The signal sits ${percent(Math.abs(f.value ?? 0))} off its middle.`,
    action:
      f.severity === 'repeat'
        ? `${AGAIN} Take the device to biomedical engineering.`
        : 'Biomedical engineering should look at the device.',
  }),
  dropout: (f) => ({
    title: 'Holes in the sound',
    meaning: `${seconds(f.value)} of sound are missing inside the clip.`,
    action:
      f.severity === 'repeat'
        ? `Move closer to the receiver and record again.`
        : 'Listen outside the marked places.',
  }),
  hum: (f) => ({
    title: 'Mains hum',
    meaning:
      f.severity === 'note'
        ? `Hum of ${db(f.value)} against the breath band. Below the limit; noted.`
        : `Hum of ${db(f.value)} against the breath band.`,
    action:
      f.severity === 'note'
        ? 'Nothing to do.'
        : 'Move away from mains equipment, unplug chargers, and record again if you can.',
  }),
  noisy: (f) => ({
    title: 'Noisy',
    meaning:
      f.unit === 'dB'
        ? `Loud and quiet differ by only ${db(f.value)}.`
        : `The noise floor is high (${db(f.value)}FS).`,
    action: 'Ask for quiet, press flat, and record again if you can.',
  }),
  handling: (f) => ({
    title: 'Handling noise',
    meaning: `Rubbing or knocking in ${percent(f.value)} of the clip.`,
    action:
      f.severity === 'repeat'
        ? 'Hold the chestpiece still on bare skin and record again.'
        : 'Listen outside the marked places.',
  }),
  spikes: (f) => ({
    title: 'Clicks',
    meaning: `${f.value ?? 0} ${f.value === 1 ? 'click' : 'clicks'} from transmission.`,
    action: 'They are not body sounds. Move closer to the receiver next time.',
  }),
  'channels-identical': () => ({
    title: 'Two equal channels',
    meaning: 'Both channels hold the same sound.',
    action: 'Noted.',
  }),
  'channel-dead': (f) => ({
    title: 'Empty channel',
    meaning: `Channel ${(f.channel ?? 0) + 1} holds no sound.`,
    action: 'Listen to the other channel; biomedical engineering should look at the device.',
  }),
  'implausible-rates': (f) => ({
    title: 'Odd rate',
    meaning: `A rate of ${Math.round(f.value ?? 0)} a minute is so odd that the sample rate is suspect.`,
    action: 'Biomedical engineering should check the device’s clock and rate.',
  }),
};

/** @returns words for any code; an unknown one is named as it stands */
export function findingSentence(finding: Loose): FindingSentence {
  return (
    SENTENCES[finding.code]?.(finding) ?? {
      title: finding.code.replaceAll('-', ' '),
      meaning: '',
      action: '',
    }
  );
}
