import { FlacFrameDecoder, SLACK_BYTES } from './flacFrame';
import {
  type FrameHeader,
  readFrameHeader,
  readStreamInfo,
  STREAMINFO_BYTES,
  type StreamInfo,
} from './flacHeader';
import { FlacOutput } from './flacOutput';
import { type DecoderOptions, type Reader, type ReaderResult, Unreadable } from './types';

/** Bytes that are gathered before frames are looked for. */
const GATHERED_BYTES = 64 * 1024;

type State = 'marker' | 'block' | 'info' | 'skip' | 'frames';

/**
 * FLAC (RFC 9639) in pieces. A frame has no length: it is decoded to find its end, and counts when its checksum
 * agrees. Damaged frames are left out and the next whole one is looked for.
 */
export class FlacReader implements Reader {
  #state: State = 'marker';
  #buffer = new Uint8Array(GATHERED_BYTES + SLACK_BYTES);
  #from = 0;
  #to = 0;
  #seen = 0;
  #skip = 0;
  #lastBlock = false;
  #info: StreamInfo | null = null;
  #decoder: FlacFrameDecoder | null = null;
  #output: FlacOutput | null = null;
  /** Bytes that must be there before the next try. */
  #wanted = 4;
  #failure: Unreadable | null = null;

  constructor(private readonly options: DecoderOptions) {}

  push(bytes: Uint8Array): void {
    for (let at = 0; at < bytes.length && !this.#failure; ) {
      if (this.#state === 'skip') {
        const passed = Math.min(this.#skip, bytes.length - at);
        this.#skip -= passed;
        this.#seen += passed;
        at += passed;
        if (this.#skip === 0) this.#afterBlock();
        continue;
      }
      const taken = this.#append(bytes, at);
      at += taken;
      this.#seen += taken;
      this.#guarded(() => this.#work(false));
    }
  }

  /** Take as many bytes as are wanted next and there is room for, at least one. */
  #append(bytes: Uint8Array, at: number): number {
    const held = this.#to - this.#from;
    if (this.#from > 0 && this.#from + Math.max(this.#wanted, held + 1) > this.#buffer.length - SLACK_BYTES) {
      this.#buffer.copyWithin(0, this.#from, this.#to);
      this.#from = 0;
      this.#to = held;
    }
    const needed = Math.max(this.#wanted, held + 1);
    if (this.#from + needed > this.#buffer.length - SLACK_BYTES) {
      const grown = new Uint8Array(needed + GATHERED_BYTES + SLACK_BYTES);
      grown.set(this.#buffer.subarray(this.#from, this.#to));
      this.#buffer = grown;
      this.#from = 0;
      this.#to = held;
    }
    // Only the head is taken byte by byte as wanted: behind it a block may follow that is not kept at all.
    const room =
      this.#state === 'frames' ? this.#buffer.length - SLACK_BYTES - this.#to : this.#wanted - held;
    const taken = Math.min(room, bytes.length - at);
    this.#buffer.set(bytes.subarray(at, at + taken), this.#to);
    this.#to += taken;
    return taken;
  }

  #guarded(work: () => void): void {
    try {
      work();
    } catch (error) {
      if (!(error instanceof Unreadable)) throw error;
      this.#failure = error;
    }
  }

  #work(atEnd: boolean): void {
    while (this.#state !== 'skip' && (this.#to - this.#from >= this.#wanted || atEnd)) {
      if (this.#state === 'frames') {
        this.#frames(atEnd);
        return;
      }
      if (this.#to - this.#from < this.#wanted) return;
      this.#head();
    }
  }

  #take(count: number): Uint8Array {
    this.#from += count;
    return this.#buffer.subarray(this.#from - count, this.#from);
  }

  #head(): void {
    if (this.#state === 'marker') {
      if (String.fromCharCode(...this.#take(4)) !== 'fLaC') throw new Unreadable('flac-marker-missing');
      this.#state = 'block';
      this.#wanted = 4;
    } else if (this.#state === 'block') {
      const [head = 0, high = 0, middle = 0, low = 0] = this.#take(4);
      const length = (high << 16) | (middle << 8) | low;
      this.#lastBlock = (head & 0x80) !== 0;
      const type = head & 0x7f;
      if (type === 127) throw new Unreadable('metadata-senseless');
      if (this.#info) {
        if (type === 0) throw new Unreadable('metadata-senseless');
        this.#skip = length;
        this.#state = 'skip';
        if (length === 0) this.#afterBlock();
        return;
      }
      if (type !== 0 || length < STREAMINFO_BYTES) throw new Unreadable('streaminfo-missing');
      this.#state = 'info';
      this.#wanted = STREAMINFO_BYTES;
      this.#skip = length - STREAMINFO_BYTES;
    } else {
      this.#info = readStreamInfo(this.#take(STREAMINFO_BYTES));
      this.#decoder = new FlacFrameDecoder(this.#info);
      this.#output = new FlacOutput(this.options, this.#info, 'flac');
      if (this.#skip > 0) this.#state = 'skip';
      else this.#afterBlock();
    }
  }

  #afterBlock(): void {
    this.#state = this.#lastBlock ? 'frames' : 'block';
    this.#wanted = this.#lastBlock ? GATHERED_BYTES : 4;
  }

  /** Decode the frames that are there. */
  #frames(atEnd: boolean): void {
    const info = this.#info as StreamInfo;
    const output = this.#output as FlacOutput;
    const decoder = this.#decoder as FlacFrameDecoder;
    for (;;) {
      const left = this.#to - this.#from;
      const header = readFrameHeader(this.#buffer, this.#from, this.#to, info);
      if (header === 'short') {
        if (atEnd && left > 0) output.refuse(this.#buffer[this.#from] === 0xff);
        this.#wanted = GATHERED_BYTES;
        return;
      }
      const length = header ? decoder.decode(this.#buffer, this.#from, this.#to, header) : 0;
      if (header && length > 0) {
        output.take(header, decoder, this.#seen);
        this.#from += length;
        continue;
      }
      if (header) {
        output.waste(header, this.#seen);
        if (length === -1 && !atEnd && left < this.#mostBytes(header)) {
          this.#wanted = Math.max(GATHERED_BYTES, Math.ceil(left * 1.5));
          return;
        }
        output.damaged(length === -1 && atEnd ? header : null);
      } else output.refuse(false);
      this.#resync();
    }
  }

  /** No frame in a useful file is longer than its samples as they are, twice over. */
  #mostBytes(header: FrameHeader): number {
    const { channels, bitDepth } = this.#info as StreamInfo;
    return Math.ceil((header.blockSize * channels * (bitDepth + 1)) / 4) + 1024;
  }

  /** Go on to the next place where a frame might begin. */
  #resync(): void {
    const found = this.#buffer.subarray(0, this.#to).indexOf(0xff, this.#from + 1);
    this.#from = found < 0 ? this.#to : found;
  }

  end(): ReaderResult {
    if (!this.#failure) this.#guarded(() => this.#work(true));
    if (this.#output) return this.#output.end(this.#failure);
    return {
      failure: 'unreadable',
      reason: this.#failure?.reason ?? 'streaminfo-missing',
      format: null,
      frames: 0,
      missingFrames: 0,
      nonFinite: 0,
    };
  }
}
