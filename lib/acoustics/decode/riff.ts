import { Unreadable } from './types';

export interface Chunk {
  name: string;
  /** Size as written, without the pad byte. */
  size: number;
  /** Where the body begins in the file. */
  bodyAt: number;
}

/** What is done with a chunk's body. `size` may differ from what was written; infinite is "to the end". */
export type Treatment =
  | { how: 'skip' | 'stream'; size: number }
  /** No size was written: a stream to the end, unless a chunk that makes sense follows at once. */
  | { how: 'doubt' }
  /** The first `keep` bytes are collected, the rest passed over. */
  | { how: 'collect'; size: number; keep: number };

export interface RiffListener {
  /** @throws Unreadable */
  onRiff(magic: string, size: number): void;
  /** @throws Unreadable */
  onChunk(chunk: Chunk): Treatment;
  onCollected(chunk: Chunk, body: Uint8Array): void;
  onStream(bytes: Uint8Array): void;
  /** Whether the sound's chunk was seen: nonsense behind it is only refuse, before it a reason to give up. */
  readonly sawData: boolean;
}

/** Names by which a chunk head is told from a pad byte and what follows it. */
const KNOWN = new Set(
  'fmt data fact LIST list JUNK junk PAD bext iXML axml chna cue smpl inst plst labl note PEAK id3 ID3 cart umid acid afsp FLLR DISP ds64 _PMX minf elm1 regn levl MD5 ubxt'.split(
    ' ',
  ),
);
/** Heads that make no sense before any sound: so many, and it is no RIFF file but noise. */
const MOST_SENSELESS_HEADS = 64;

type State = 'riff' | 'head' | 'collect' | 'skip' | 'stream' | 'refuse';

const fourAt = (bytes: Uint8Array, at: number): string =>
  String.fromCharCode(bytes[at] ?? 0, bytes[at + 1] ?? 0, bytes[at + 2] ?? 0, bytes[at + 3] ?? 0);

const isName = (bytes: Uint8Array, at: number): boolean => {
  for (let i = at; i < at + 4; i++) if ((bytes[i] ?? 0) < 32 || (bytes[i] ?? 0) > 126) return false;
  return true;
};
const isKnown = (bytes: Uint8Array, at: number): boolean => KNOWN.has(fourAt(bytes, at).trimEnd());

/**
 * Walks the chunks of a RIFF, RIFX, RF64 or BW64 file that comes in pieces. Sizes are plain numbers that are counted
 * down and never allocated; nothing is held but one head and what is collected.
 */
export class RiffWalker {
  readonly oddities = new Set<string>();
  bigEndian = false;
  /** Bytes seen so far. */
  position = 0;
  #state: State = 'riff';
  readonly #head = new Uint8Array(12);
  #headFilled = 0;
  #chunk: Chunk = { name: '', size: 0, bodyAt: 0 };
  #left = 0;
  #padded = false;
  #body = new Uint8Array(0);
  #bodyFilled = 0;
  #senseless = 0;
  #doubtful = false;
  #riffEnd = 0;

  constructor(private readonly listener: RiffListener) {}

  /** @throws Unreadable */
  push(bytes: Uint8Array): void {
    for (let at = 0; at < bytes.length; ) at += this.#step(at === 0 ? bytes : bytes.subarray(at));
  }

  /** No more bytes: what stands unfinished is named among the oddities. */
  end(): void {
    if (this.#state === 'collect') this.#collected();
    if (this.#doubtful && this.#headFilled > 0) {
      this.#beginStream(this.#headFilled);
      return;
    }
    if (this.#state === 'head' && this.#headFilled > (this.#padded && this.#head[0] === 0 ? 1 : 0))
      this.oddities.add('trailing-bytes');
    if (this.#state === 'skip')
      this.oddities.add(KNOWN.has(this.#chunk.name.trimEnd()) ? 'chunk-cut' : 'trailing-bytes');
    if (this.#state === 'head' && this.#padded && this.#headFilled === 0)
      this.oddities.add('pad-byte-missing');
  }

  #step(bytes: Uint8Array): number {
    switch (this.#state) {
      case 'riff':
        return this.#gather(bytes, 12, () => this.#onRiff());
      case 'head':
        return this.#gather(bytes, 8, () => this.#onHead());
      case 'collect': {
        const taken = Math.min(bytes.length, this.#body.length - this.#bodyFilled);
        this.#body.set(bytes.subarray(0, taken), this.#bodyFilled);
        this.#bodyFilled += taken;
        this.#left -= taken;
        this.position += taken;
        if (this.#bodyFilled === this.#body.length) this.#collected();
        return taken;
      }
      case 'skip':
      case 'stream': {
        const taken = Math.min(bytes.length, this.#left);
        this.#left -= taken;
        this.position += taken;
        if (this.#state === 'stream')
          this.listener.onStream(taken === bytes.length ? bytes : bytes.subarray(0, taken));
        if (this.#left === 0) this.#state = 'head';
        return taken;
      }
      case 'refuse':
        this.position += bytes.length;
        return bytes.length;
    }
  }

  #gather(bytes: Uint8Array, wanted: number, whole: () => void): number {
    const taken = Math.min(bytes.length, wanted - this.#headFilled);
    this.#head.set(bytes.subarray(0, taken), this.#headFilled);
    this.#headFilled += taken;
    this.position += taken;
    if (this.#headFilled === wanted) {
      this.#headFilled = 0;
      whole();
    }
    return taken;
  }

  #size(): number {
    return new DataView(this.#head.buffer).getUint32(4, !this.bigEndian);
  }

  #onRiff(): void {
    const magic = fourAt(this.#head, 0);
    this.bigEndian = magic === 'RIFX';
    if (fourAt(this.#head, 8) !== 'WAVE') throw new Unreadable('not-wave');
    this.#state = 'head';
    this.#riffEnd = 8 + this.#size();
    this.listener.onRiff(magic, this.#size());
  }

  #onHead(): void {
    if (this.#padded) {
      this.#padded = false;
      // A chunk of odd size is followed by a pad byte that its size does not count (RIFF). Writers forget it.
      const forgotten =
        isKnown(this.#head, 0) || (this.#head[0] !== 0 && isName(this.#head, 0) && !isKnown(this.#head, 1));
      if (!forgotten) {
        this.#head.copyWithin(0, 1, 8);
        this.#headFilled = 7;
        return;
      }
      this.oddities.add('pad-byte-missing');
    }
    const size = this.#size();
    if (this.#doubtful) {
      this.#doubtful = false;
      const fits = this.position + size <= Math.max(this.#riffEnd, this.position);
      if (!isKnown(this.#head, 0) || !fits) {
        this.#beginStream(8);
        return;
      }
    }
    if (!isName(this.#head, 0) && !this.#tolerate()) return;
    this.#chunk = { name: fourAt(this.#head, 0), size, bodyAt: this.position };
    this.#begin(this.listener.onChunk(this.#chunk));
  }

  /** What was taken for a chunk's head is sound. */
  #beginStream(bytes: number): void {
    this.#state = 'stream';
    this.#left = Number.POSITIVE_INFINITY;
    this.listener.onStream(this.#head.slice(0, bytes));
  }

  #tolerate(): boolean {
    if (this.listener.sawData) {
      this.oddities.add('trailing-bytes');
      this.#state = 'refuse';
      return false;
    }
    this.oddities.add('chunk-name-odd');
    if (++this.#senseless > MOST_SENSELESS_HEADS) throw new Unreadable('chunks-senseless');
    return true;
  }

  #begin(treatment: Treatment): void {
    if (treatment.how === 'doubt') {
      this.#doubtful = true;
      this.#state = 'head';
      return;
    }
    this.#left = treatment.size;
    this.#padded = Number.isFinite(treatment.size) && treatment.size % 2 === 1;
    if (treatment.how === 'collect') {
      this.#body = new Uint8Array(Math.min(treatment.size, treatment.keep));
      this.#bodyFilled = 0;
      this.#state = 'collect';
      if (this.#body.length === 0) this.#collected();
      return;
    }
    this.#state = treatment.size === 0 ? 'head' : treatment.how;
  }

  #collected(): void {
    this.#state = this.#left === 0 ? 'head' : 'skip';
    this.listener.onCollected(this.#chunk, this.#body.subarray(0, this.#bodyFilled));
  }
}
