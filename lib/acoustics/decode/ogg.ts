import { GAVE_UP } from './askDecoder';
import type { OggCodec } from './oggCodec';
import { OggFlacCodec } from './oggFlac';
import { OggPackets } from './oggPackets';
import { type OggPage, OggPages } from './oggPages';
import { OpusCodec } from './opus';
import { type DecoderOptions, type Reader, type ReaderResult, Unreadable } from './types';
import { VorbisCodec } from './vorbis';

/** First packets are short: a longer one is none that is known. */
const MOST_FIRST_PACKET_BYTES = 4096;

/** Ogg (RFC 3533): the first logical stream whose codec is known is the recording. */
export class OggReader implements Reader {
  readonly #pages = new OggPages();
  readonly #oddities = this.#pages.oddities;
  readonly #packets = new OggPackets(this.#oddities);
  #serial: number | null = null;
  #codec: OggCodec | null = null;
  #over = false;
  #failure: Unreadable | null = null;

  constructor(private readonly options: DecoderOptions) {}

  async push(bytes: Uint8Array): Promise<void> {
    for (let at = 0; at < bytes.length && !this.#failure; ) {
      at += this.#pages.feed(bytes, at);
      await this.#guarded(async () => {
        for (let page = this.#pages.next(); page; page = this.#pages.next()) await this.#onPage(page);
      });
    }
  }

  async #guarded(work: () => Promise<void>): Promise<void> {
    try {
      await work();
    } catch (error) {
      if (!(error instanceof Unreadable)) throw error;
      this.#failure = error;
    }
  }

  async #onPage(page: OggPage): Promise<void> {
    if (this.#serial === null) {
      await this.#choose(page);
      return;
    }
    if (this.#over) {
      if (page.first) this.#oddities.add('chained-streams');
      return;
    }
    if (page.serial !== this.#serial) {
      this.#oddities.add('other-streams');
      return;
    }
    await this.#take(page);
  }

  async #choose(page: OggPage): Promise<void> {
    if (!page.first) throw new Unreadable('ogg-codec-unknown');
    const packets: (Uint8Array | null)[] = [];
    new OggPackets(this.#oddities).page(page, MOST_FIRST_PACKET_BYTES, (packet) => packets.push(packet));
    const create = creatorOf(packets[0] ?? new Uint8Array(0));
    if (!create) {
      this.#oddities.add('other-streams');
      return;
    }
    this.#serial = page.serial;
    this.#codec = await create(this.options, this.#oddities);
    // The first packet made the codec; the sequence of pages is followed from its page on.
    this.#packets.page(page, MOST_FIRST_PACKET_BYTES, () => undefined);
  }

  async #take(page: OggPage): Promise<void> {
    const codec = this.#codec as OggCodec;
    const packets: (Uint8Array | null)[] = [];
    this.#packets.page(page, codec.mostPacketBytes, (packet) => packets.push(packet));
    for (const packet of packets) await codec.packet(packet);
    await codec.pageEnd(page.granule, page.last, this.#pages.seen);
    if (page.last) this.#over = true;
  }

  async end(): Promise<ReaderResult> {
    const cut = this.#pages.cut();
    if (cut && cut.serial === this.#serial) this.#codec?.cut(cut.granule);
    else if (this.#pages.left > 0) this.#oddities.add('stray-bytes');
    const failure = this.#failure;
    const result = this.#codec?.end(failure);
    this.#codec?.free();
    if (!result)
      return {
        failure: failure?.failure ?? 'unreadable',
        reason: failure?.reason ?? 'ogg-codec-unknown',
        format: null,
        frames: 0,
        missingFrames: 0,
        nonFinite: 0,
      };
    return this.#weighed(result, failure);
  }

  #weighed(result: ReaderResult, failure: Unreadable | null): ReaderResult {
    if (result.nonFinite > 0) this.#oddities.add('non-finite-samples');
    const givenUp = failure?.reason === GAVE_UP && result.frames > 0;
    if (givenUp) this.#oddities.add('packets-damaged');
    if (result.format)
      result.format.oddities = [...new Set([...result.format.oddities, ...this.#oddities])].sort();
    // A decoder that gave up half way leaves what it had made.
    if (failure && !givenUp) return { ...result, failure: failure.failure, reason: failure.reason };
    if (result.frames > 0) return { ...result, failure: null, reason: '' };
    return { ...result, failure: 'empty', reason: result.missingFrames > 0 ? 'data-missing' : 'no-samples' };
  }
}

type Creator = (options: DecoderOptions, oddities: Set<string>) => Promise<OggCodec> | OggCodec;

/** By the first packet: RFC 7845 5.1, Vorbis I 4.2.1, RFC 9639 10.1. */
function creatorOf(packet: Uint8Array): Creator | null {
  const text = String.fromCharCode(...packet.subarray(0, 8));
  if (text === 'OpusHead') return (options, oddities) => OpusCodec.create(packet, options, oddities);
  if (text.startsWith('\u0001vorbis'))
    return (options, oddities) => VorbisCodec.create(packet, options, oddities);
  if (text.startsWith('\u007fFLAC'))
    return (options, oddities) => new OggFlacCodec(packet, options, oddities);
  return null;
}
