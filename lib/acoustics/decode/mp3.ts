import { MPEGDecoder } from 'mpg123-decoder';
import { askDecoder, freeDecoder, GAVE_UP } from './askDecoder';
import { BlockSink } from './blocks';
import { MP3_HEADER_BYTES, type Mp3Header, type Mp3Tag, readMp3Header, readMp3Tag } from './mp3Header';
import { checkFormat, type DecoderOptions, type Reader, type ReaderResult, Unreadable } from './types';

/** Bytes that are gathered before frames are looked for. The longest frame has 1,441. */
const GATHERED_BYTES = 64 * 1024;
/** No frame within so much: there is none. */
const MOST_BYTES_BEFORE_SOUND = 1 << 20;

/**
 * MPEG audio layer III in pieces. Only whole frames of one format, one after another, reach the decoder: what it would
 * do with anything else is not left to it.
 */
export class Mp3Reader implements Reader {
  readonly #buffer = new Uint8Array(2 * GATHERED_BYTES);
  #from = 0;
  #to = 0;
  #seen = 0;
  readonly #oddities = new Set<string>();
  #format: Mp3Header | null = null;
  #tag: Mp3Tag | null = null;
  #sink: BlockSink | null = null;
  /** Samples a channel that came out of the decoder. */
  #decoded = 0;
  /** The file ends within a frame of so many samples. */
  #cut = 0;
  /** First bytes of a stretch that holds no frame; null where frames follow on each other. */
  #stray: string | null = null;
  #inRow = false;
  #failure: Unreadable | null = null;

  private constructor(
    private readonly options: DecoderOptions,
    private readonly decoder: MPEGDecoder,
  ) {}

  static async create(options: DecoderOptions): Promise<Mp3Reader> {
    // Encoder delay and padding are cut off here, by what the tag says.
    const decoder = new MPEGDecoder({ enableGapless: false });
    await decoder.ready;
    return new Mp3Reader(options, decoder);
  }

  push(bytes: Uint8Array): void {
    for (let at = 0; at < bytes.length && !this.#failure; ) {
      if (this.#from > 0) {
        this.#buffer.copyWithin(0, this.#from, this.#to);
        this.#to -= this.#from;
        this.#from = 0;
      }
      const taken = Math.min(bytes.length - at, this.#buffer.length - this.#to);
      this.#buffer.set(bytes.subarray(at, at + taken), this.#to);
      this.#to += taken;
      this.#seen += taken;
      at += taken;
      if (this.#to >= GATHERED_BYTES) this.#guarded(() => this.#frames(false));
    }
  }

  #guarded(work: () => void): void {
    try {
      work();
    } catch (error) {
      if (!(error instanceof Unreadable)) throw error;
      this.#failure = error;
    }
  }

  /** Collect frames that stand one after another and decode them together. */
  #frames(atEnd: boolean): void {
    let start = this.#from;
    while (this.#to - this.#from >= MP3_HEADER_BYTES) {
      const header = readMp3Header(this.#buffer, this.#from);
      const next = this.#from + (header?.bytes ?? 0);
      const good = header !== null && this.#accepts(header) && this.#stands(header, next, atEnd);
      if (good === 'unsure' || (good && next > this.#to)) {
        if (atEnd && header) this.#cut = header.samples;
        break;
      }
      if (good && header) {
        if (this.#enter(header, next)) start = next;
        this.#from = next;
      } else {
        this.#decode(start, this.#from);
        this.#pass();
        start = this.#from;
      }
    }
    this.#decode(start, this.#from);
    if (atEnd && this.#cut === 0 && this.#to > this.#from) this.#markStray();
  }

  #accepts(header: Mp3Header): boolean {
    const format = this.#format;
    return (
      format === null || (header.sampleRateHz === format.sampleRateHz && header.channels === format.channels)
    );
  }

  /** Frames that follow on each other are believed; the first one only with another behind it: two are no chance. */
  #stands(header: Mp3Header, next: number, atEnd: boolean): boolean | 'unsure' {
    if (this.#inRow) return true;
    if (next + MP3_HEADER_BYTES > this.#to) return atEnd ? next <= this.#to : 'unsure';
    const following = readMp3Header(this.#buffer, next);
    return (
      following !== null &&
      following.sampleRateHz === header.sampleRateHz &&
      following.channels === header.channels
    );
  }

  /** A frame is taken. @returns whether it is no sound but the encoder's tag */
  #enter(header: Mp3Header, next: number): boolean {
    if (this.#stray !== null) this.#oddities.add('stray-bytes');
    this.#stray = null;
    this.#inRow = true;
    if (this.#format) return false;
    this.#format = header;
    checkFormat(header.sampleRateHz, header.channels);
    this.#tag = readMp3Tag(this.#buffer.subarray(this.#from, next), header);
    const { codecFrames = null, delay = 0, padding = 0 } = this.#tag ?? {};
    const declared = codecFrames === null ? null : codecFrames * header.samples - delay - padding;
    const format = {
      container: 'mp3' as const,
      encoding: 'mp3' as const,
      lossy: true,
      sampleRateHz: header.sampleRateHz,
      channels: header.channels,
      bitDepth: null,
      declaredFrames: declared !== null && declared > 0 ? declared : null,
      oddities: [],
    };
    this.#sink = new BlockSink(this.options, format, true);
    this.options.onFormat(format);
    return this.#tag !== null;
  }

  /** Go on to the next place where a frame might begin. */
  #pass(): void {
    this.#markStray();
    this.#inRow = false;
    if (!this.#format && this.#seen - (this.#to - this.#from) > MOST_BYTES_BEFORE_SOUND)
      throw new Unreadable('no-frames');
    const found = this.#buffer.subarray(0, this.#to).indexOf(0xff, this.#from + 1);
    this.#from = found < 0 ? this.#to : found;
  }

  #markStray(): void {
    this.#stray ??= String.fromCharCode(
      ...this.#buffer.subarray(this.#from, Math.min(this.#from + 8, this.#to)),
    );
  }

  /** Decode the frames from `start` to `end` of the buffer. */
  #decode(start: number, end: number): void {
    const sink = this.#sink;
    if (end <= start || !sink) return;
    const decoded = askDecoder(() => this.decoder.decode(this.#buffer.subarray(start, end)));
    if (decoded.errors.length > 0) this.#oddities.add('frames-damaged');
    const samples = decoded.samplesDecoded;
    if (samples === 0) return;
    if (decoded.sampleRate !== sink.format.sampleRateHz) throw new Unreadable('rate-changes');
    const before = this.#decoded;
    this.#decoded += samples;
    const delay = this.#tag?.delay ?? 0;
    const from = Math.min(samples, Math.max(0, delay - before));
    const { declaredFrames } = sink.format;
    const soundEnd = declaredFrames === null ? Number.POSITIVE_INFINITY : delay + declaredFrames;
    const goesOn = soundEnd + (this.#tag?.padding ?? 0);
    const within = (at: number) => Math.min(samples, Math.max(from, at - before));
    sink.write(decoded.channelData, from, within(soundEnd), this.#seen);
    // The tag told of fewer frames than there are.
    if (within(goesOn) < samples) this.#oddities.add('longer-than-declared');
    sink.write(decoded.channelData, within(goesOn), samples, this.#seen);
  }

  end(): ReaderResult {
    if (!this.#failure) this.#guarded(() => this.#frames(true));
    freeDecoder(this.decoder);
    const sink = this.#sink;
    sink?.flush();
    const frames = sink?.frames ?? 0;
    // Tags of players stand behind the sound (ID3v1, APEv2); anything else is remarkable.
    if (this.#stray !== null && !/^(TAG|APETAGEX)/.test(this.#stray)) this.#oddities.add('trailing-bytes');
    if (sink && sink.nonFinite > 0) this.#oddities.add('non-finite-samples');
    if (sink) sink.format.oddities = [...this.#oddities].sort();
    const declared = sink?.format.declaredFrames ?? null;
    const missingFrames = declared === null ? this.#cut : Math.max(0, declared - frames);
    const answer = { format: sink?.format ?? null, frames, missingFrames, nonFinite: sink?.nonFinite ?? 0 };
    // A decoder that gave up half way leaves what it had made.
    if (this.#failure && !(this.#failure.reason === GAVE_UP && frames > 0))
      return { ...answer, failure: this.#failure.failure, reason: this.#failure.reason };
    if (frames > 0) return { ...answer, failure: null, reason: '' };
    if (this.#tag)
      return { ...answer, failure: 'empty', reason: missingFrames > 0 ? 'data-missing' : 'no-samples' };
    return { ...answer, failure: 'unreadable', reason: 'no-frames' };
  }
}
