import { OggVorbisDecoder } from '@wasm-audio-decoders/ogg-vorbis';
import { askDecoder, freeDecoder, GAVE_UP } from './askDecoder';
import { BlockSink } from './blocks';
import { Granules } from './granules';
import type { OggCodec } from './oggCodec';
import { checkFormat, type DecoderOptions, type ReaderResult, Unreadable } from './types';

/** What the decoder has room for. */
const MOST_PACKET_BYTES = 128 * 1024;
/** Segments a page can hold (RFC 3533, 6). */
const MOST_SEGMENTS = 255;

/**
 * Identification header (Vorbis I, 4.2.2).
 *
 * @throws Unreadable `vorbis-head-wrong`, `rate-out-of-range`, `channels-out-of-range`
 */
export function readVorbisHead(packet: Uint8Array): { channels: number; sampleRateHz: number } {
  if (packet.length < 30) throw new Unreadable('vorbis-head-wrong');
  const view = new DataView(packet.buffer, packet.byteOffset, packet.byteLength);
  const sizes = view.getUint8(28);
  const small = sizes & 0x0f;
  const large = sizes >> 4;
  if (view.getUint32(7, true) !== 0 || small < 6 || large > 13 || small > large || !(view.getUint8(29) & 1))
    throw new Unreadable('vorbis-head-wrong');
  const head = { channels: view.getUint8(11), sampleRateHz: view.getUint32(12, true) };
  checkFormat(head.sampleRateHz, head.channels);
  return head;
}

/**
 * Packets laid into fresh pages, so that the decoder's own reading of Ogg meets nothing but what was checked here. It
 * does not look at checksums.
 */
export class PageWriter {
  #sequence = 0;

  write(packets: readonly Uint8Array[], first: boolean): Uint8Array[] {
    const pages: Uint8Array[] = [];
    let lacing: number[] = [];
    let body: Uint8Array[] = [];
    let continued = false;
    const flush = (carriesOn: boolean) => {
      if (lacing.length > 0) pages.push(this.#page(lacing, body, (continued ? 1 : 0) | (first ? 2 : 0)));
      lacing = [];
      body = [];
      continued = carriesOn;
    };
    for (const packet of packets) {
      for (let at = 0; ; at += 255) {
        if (lacing.length === MOST_SEGMENTS) flush(at > 0);
        const length = Math.min(255, packet.length - at);
        lacing.push(length);
        body.push(packet.subarray(at, at + length));
        if (length < 255) break;
      }
    }
    flush(false);
    return pages;
  }

  #page(lacing: readonly number[], body: readonly Uint8Array[], flags: number): Uint8Array {
    const headBytes = 27 + lacing.length;
    const page = new Uint8Array(headBytes + body.reduce((sum, part) => sum + part.length, 0));
    page.set([0x4f, 0x67, 0x67, 0x53, 0, flags]);
    new DataView(page.buffer).setUint32(18, this.#sequence++, true);
    page[26] = lacing.length;
    page.set(lacing, 27);
    let at = headBytes;
    for (const part of body) {
      page.set(part, at);
      at += part.length;
    }
    return page;
  }
}

/** Vorbis in Ogg (Vorbis I, appendix A). Lossy. */
export class VorbisCodec implements OggCodec {
  readonly mostPacketBytes = MOST_PACKET_BYTES;
  readonly #sink: BlockSink;
  readonly #granules = new Granules(0, true);
  readonly #pages = new PageWriter();
  #headers = 1;
  #packets: Uint8Array[] = [];
  /** The decoder wants to see one byte behind a page, so the next page's first byte goes ahead of it. */
  #ahead = false;

  private constructor(
    private readonly head: Uint8Array,
    private readonly decoder: OggVorbisDecoder,
    options: DecoderOptions,
    private readonly oddities: Set<string>,
  ) {
    const format = {
      container: 'ogg' as const,
      encoding: 'vorbis' as const,
      lossy: true,
      ...readVorbisHead(head),
      bitDepth: null,
      declaredFrames: null,
      oddities: [],
    };
    this.#sink = new BlockSink(options, format, true);
    options.onFormat(format);
  }

  /** @throws Unreadable */
  static async create(
    packet: Uint8Array,
    options: DecoderOptions,
    oddities: Set<string>,
  ): Promise<VorbisCodec> {
    readVorbisHead(packet);
    const decoder = new OggVorbisDecoder();
    await decoder.ready;
    return new VorbisCodec(packet, decoder, options, oddities);
  }

  async packet(packet: Uint8Array | null): Promise<void> {
    if (this.#headers === 1) this.#headers = 2;
    else if (this.#headers === 2) {
      if (packet?.[0] !== 5) throw new Unreadable('vorbis-setup-missing');
      this.#headers = 3;
      await this.#decode(this.#pages.write([this.head], true));
      await this.#decode(this.#pages.write([packet], false));
    } else if (packet === null || packet.length === 0 || ((packet[0] ?? 0) & 1) !== 0)
      this.oddities.add('packets-damaged');
    else this.#packets.push(packet);
  }

  async #decode(pages: readonly Uint8Array[]) {
    const bytes = new Uint8Array(pages.reduce((sum, page) => sum + page.length, 1));
    let at = 0;
    for (const page of pages) {
      bytes.set(page, at);
      at += page.length;
    }
    bytes[at] = 0x4f;
    const decoded = askDecoder(() => this.decoder.decode(this.#ahead ? bytes.subarray(1) : bytes));
    this.#ahead = true;
    return await decoded.catch(() => {
      throw new Unreadable(GAVE_UP);
    });
  }

  async pageEnd(granule: number | null, last: boolean, bytesSoFar: number): Promise<void> {
    const packets = this.#packets;
    this.#packets = [];
    if (this.#headers < 3) return;
    const decoded = packets.length > 0 ? await this.#decode(this.#pages.write(packets, false)) : null;
    const samples = decoded?.samplesDecoded ?? 0;
    if (decoded && decoded.errors.length > 0) this.oddities.add('packets-damaged');
    const { from, to } = this.#granules.page(samples, granule, last);
    if (decoded && decoded.channelData.length >= this.#sink.channels.length)
      this.#sink.write(decoded.channelData, from, to, bytesSoFar);
  }

  cut(granule: number | null): void {
    this.#granules.cut(granule);
  }

  end(): ReaderResult {
    this.#sink.flush();
    if (!this.#granules.ended) this.oddities.add('end-page-missing');
    const { frames, format, nonFinite } = this.#sink;
    const { missing } = this.#granules;
    return { failure: null, reason: '', format, frames, missingFrames: missing, nonFinite };
  }

  free(): void {
    freeDecoder(this.decoder);
  }
}
