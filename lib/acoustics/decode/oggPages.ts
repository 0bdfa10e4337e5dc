import { oggCrc } from './crc';
import { Unreadable } from './types';

/** One page (RFC 3533, 6). Arrays are views that hold until the next call. */
export interface OggPage {
  serial: number;
  sequence: number;
  /** Position that the codec gives the end of the last packet which ends on this page; null: none ends here. */
  granule: number | null;
  continued: boolean;
  first: boolean;
  last: boolean;
  /** Lengths of the segments; one below 255 ends a packet. */
  lacing: Uint8Array;
  body: Uint8Array;
}

const HEADER_BYTES = 27;
const LONGEST_PAGE_BYTES = HEADER_BYTES + 255 + 255 * 255;
const BUFFER_BYTES = 2 * LONGEST_PAGE_BYTES;
/** Bytes of pages that turned out false: so many, and so many for each byte of the file, are summed up. */
const FREE_WASTED_BYTES = 64 << 20;
const WASTED_PER_BYTE = 8;

const isCapture = (bytes: Uint8Array, at: number): boolean =>
  bytes[at] === 0x4f && bytes[at + 1] === 0x67 && bytes[at + 2] === 0x67 && bytes[at + 3] === 0x53;

/** Cuts a stream into pages whose checksum agrees; what does not agree is passed over. */
export class OggPages {
  readonly oddities = new Set<string>();
  /** Bytes taken so far. */
  seen = 0;
  readonly #buffer = new Uint8Array(BUFFER_BYTES);
  #from = 0;
  #to = 0;
  #wasted = 0;

  /** @returns how many of the bytes from `at` on were taken; pages are then asked for until there is none */
  feed(bytes: Uint8Array, at: number): number {
    if (this.#from > 0) {
      this.#buffer.copyWithin(0, this.#from, this.#to);
      this.#to -= this.#from;
      this.#from = 0;
    }
    const taken = Math.min(bytes.length - at, BUFFER_BYTES - this.#to);
    this.#buffer.set(bytes.subarray(at, at + taken), this.#to);
    this.#to += taken;
    this.seen += taken;
    return taken;
  }

  /** @throws Unreadable `too-damaged` */
  next(): OggPage | null {
    for (;;) {
      if (this.#to - this.#from < HEADER_BYTES) return null;
      const page = isCapture(this.#buffer, this.#from) ? this.#read() : 'none';
      if (page === 'short') return null;
      if (page !== 'none') return page;
      this.#resync();
    }
  }

  /** A page that the end of the file cut off: what its header said of it. */
  cut(): { serial: number; granule: number | null } | null {
    if (this.#to - this.#from < HEADER_BYTES || !isCapture(this.#buffer, this.#from)) return null;
    const view = this.#view();
    return { serial: view.getUint32(14, true), granule: granuleOf(view) };
  }

  /** Bytes that are held and made no page. */
  get left(): number {
    return this.#to - this.#from;
  }

  #view(): DataView {
    return new DataView(this.#buffer.buffer, this.#from, HEADER_BYTES);
  }

  #read(): OggPage | 'short' | 'none' {
    const buffer = this.#buffer;
    const at = this.#from;
    if (buffer[at + 4] !== 0) return 'none';
    const bodyAt = at + HEADER_BYTES + (buffer[at + 26] as number);
    if (bodyAt > this.#to) return 'short';
    const lacing = buffer.subarray(at + HEADER_BYTES, bodyAt);
    const end = bodyAt + lacing.reduce((sum, length) => sum + length, 0);
    if (end > this.#to) return 'short';
    const view = this.#view();
    if (oggCrc(buffer.subarray(at, end)) !== view.getUint32(22, true)) {
      this.#wasted += end - at;
      if (this.#wasted > FREE_WASTED_BYTES + WASTED_PER_BYTE * this.seen)
        throw new Unreadable('too-damaged', 'refused-limits');
      this.oddities.add('pages-damaged');
      return 'none';
    }
    this.#from = end;
    const flags = buffer[at + 5] as number;
    return {
      serial: view.getUint32(14, true),
      sequence: view.getUint32(18, true),
      granule: granuleOf(view),
      continued: (flags & 1) !== 0,
      first: (flags & 2) !== 0,
      last: (flags & 4) !== 0,
      lacing,
      body: buffer.subarray(bodyAt, end),
    };
  }

  #resync(): void {
    const found = this.#buffer.subarray(0, this.#to).indexOf(0x4f, this.#from + 1);
    const next = found < 0 ? this.#to : found;
    this.#from = next;
    this.oddities.add('stray-bytes');
  }
}

function granuleOf(view: DataView): number | null {
  const granule = Number(view.getBigInt64(6, true));
  return granule < 0 ? null : granule;
}
