import type { CompleteAnswer } from '@/lib/contract/device';
import type { Clip } from './clip';
import type { Disk } from './disk';
import { HEAD_LIMIT_BYTES, Journal, packClip, readHead, sha256Hex, unpackClip } from './entry';

/**
 * Store and forward. A clip is `<place>.clip`, whole from the moment its name appears; how far it got is
 * `<place>.json`, replaced whole at every step. So whatever instant the power goes at, each clip that was taken is
 * found again in a state it was truly in, and any step after it may be repeated. The bytes go only after the answer
 * is durable.
 */
export interface Queue {
  /**
   * Take a clip; it is safe when this returns. The same clip again, as after a power cut, is the one that is there.
   * @throws NumberTaken when the number was used for other bytes
   */
  add(clip: Clip): Promise<Place>;
  /** Every clip, in the order in which they were taken. */
  list(): Promise<Entry[]>;
  /** The clip itself. @returns null when the disk no longer has what was recorded */
  clipOf(place: Place): Promise<Clip | null>;
  /** Note durably how far a clip got. */
  note(place: Place, journal: Journal): Promise<void>;
  /** Keep the service's answer durably, then let go of the bytes. */
  complete(entry: Entry, answer: CompleteAnswer): Promise<void>;
  /** Put a refused clip in line again. */
  tryAgain(place: Place): Promise<void>;
  /** Give a clip up, bytes and all. */
  drop(place: Place): Promise<void>;
}

/** Where a clip is kept: its place in line and a name made of its number. */
export type Place = string;

export interface Entry {
  place: Place;
  /** Null when not even the head of the clip's file can be read. */
  recordingNumber: string | null;
  sha256: string | null;
  journal: Journal | { state: 'queued' };
}

export class NumberTaken extends Error {}

const FOLDER = 'queue';
/** Answers that are kept after their bytes went, so that a clip taken twice is still known. */
const KEPT_ANSWERS = 200;

const clipFile = (place: Place) => `${FOLDER}/${place}.clip`;
const journalFile = (place: Place) => `${FOLDER}/${place}.json`;
const nameOf = (recordingNumber: string) => sha256Hex(recordingNumber).slice(0, 24);
const placeIn = (file: string) => file.replace(/\.(clip|json)$/, '');

async function readJournal(disk: Disk, place: Place): Promise<Entry['journal']> {
  const bytes = await disk.read(journalFile(place));
  if (bytes === null) return { state: 'queued' };
  try {
    return Journal.parse(JSON.parse(new TextDecoder().decode(bytes)));
  } catch {
    // Any step may be repeated, so a journal that cannot be read costs nothing but the repetition.
    return { state: 'queued' };
  }
}

async function readEntry(disk: Disk, place: Place): Promise<Entry> {
  const journal = await readJournal(disk, place);
  if (journal.state === 'completed')
    return { place, journal, recordingNumber: journal.recordingNumber, sha256: journal.sha256 };
  const start = await disk.read(clipFile(place), HEAD_LIMIT_BYTES);
  const head = start && readHead(start);
  return {
    place,
    journal: head ? journal : { state: 'damaged', why: 'the file of the clip cannot be read' },
    recordingNumber: head?.facts.recordingNumber ?? null,
    sha256: head?.sha256 ?? null,
  };
}

async function places(disk: Disk): Promise<Place[]> {
  return [...new Set((await disk.list(FOLDER)).map(placeIn))].sort();
}

/** What the queue holds, without putting anything in order: for looking at one that another process has. */
export async function readQueue(disk: Disk): Promise<Entry[]> {
  const entries: Entry[] = [];
  for (const place of await places(disk)) entries.push(await readEntry(disk, place));
  return entries;
}

/** What a power cut left of a clip that was done with or given up, and answers beyond those kept. */
async function tidy(disk: Disk): Promise<void> {
  await disk.sweep(FOLDER);
  const files = new Set(await disk.list(FOLDER));
  const completed: Place[] = [];
  for (const place of await places(disk)) {
    if (!files.has(`${place}.json`)) continue;
    const { state } = await readJournal(disk, place);
    const hasClip = files.has(`${place}.clip`);
    if (state === 'completed') completed.push(place);
    if (state === 'completed' && hasClip) await disk.remove(clipFile(place));
    if ((state === 'refused' || state === 'damaged') && !hasClip) await disk.remove(journalFile(place));
  }
  for (const place of completed.slice(0, -KEPT_ANSWERS)) await disk.remove(journalFile(place));
}

/** The queue of a device's disk, in order again after whatever ended the process before. */
export async function openQueue(disk: Disk): Promise<Queue> {
  await tidy(disk);
  let completedSinceTidy = 0;
  const note = (place: Place, journal: Journal) => disk.write(journalFile(place), JSON.stringify(journal));

  async function add(clip: Clip): Promise<Place> {
    const { file, sha256, recordingNumber } = packClip(clip);
    const taken = await places(disk);
    const name = nameOf(recordingNumber);
    const known = taken.find((place) => place.endsWith(`-${name}`));
    if (known) {
      if ((await readEntry(disk, known)).sha256 === sha256) return known;
      throw new NumberTaken(`${recordingNumber} was used for another recording`);
    }
    const last = Number(taken.at(-1)?.split('-')[0] ?? 0);
    const place = `${String(last + 1).padStart(9, '0')}-${name}`;
    await disk.write(clipFile(place), file);
    return place;
  }

  // One at a time: two that look for the next place at once would find the same.
  let adding: Promise<unknown> = Promise.resolve();
  return {
    add(clip) {
      const mine = adding.then(() => add(clip));
      adding = mine.catch(() => undefined);
      return mine;
    },
    note,
    list: () => readQueue(disk),
    async clipOf(place) {
      const file = await disk.read(clipFile(place));
      return file && unpackClip(file);
    },
    async complete(entry, answer) {
      await note(entry.place, {
        state: 'completed',
        recordingNumber: entry.recordingNumber ?? '',
        sha256: entry.sha256 ?? answer.sha256,
        answer,
      });
      // The answer is durable from here; a power cut now leaves bytes that the next start removes.
      await disk.remove(clipFile(entry.place));
      if (++completedSinceTidy < KEPT_ANSWERS) return;
      completedSinceTidy = 0;
      await tidy(disk);
    },
    tryAgain: (place) => disk.remove(journalFile(place)),
    async drop(place) {
      await note(place, { state: 'refused', code: 'given-up', title: 'Given up on the device' });
      // The clip first: a journal alone is tidied away, a clip alone would be sent.
      await disk.remove(clipFile(place));
      await disk.remove(journalFile(place));
    },
  };
}
