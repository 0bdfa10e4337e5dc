import { OpusDecoder } from 'opus-decoder';
import { askDecoder, freeDecoder } from './askDecoder';
import { BlockSink } from './blocks';
import { Granules } from './granules';
import type { OggCodec } from './oggCodec';
import { type DecoderOptions, MOST_CHANNELS, type ReaderResult, Unreadable } from './types';

/** Opus is decoded at the rate its own clock runs at (RFC 7845, 5.1). */
const RATE_HZ = 48_000;

interface OpusHead {
  channels: number;
  preSkip: number;
  inputRateHz: number;
  gain: number;
  streams: number;
  coupled: number;
  mapping: number[];
}

/**
 * Identification header (RFC 7845, 5.1).
 *
 * @throws Unreadable `opus-head-wrong`, `channels-out-of-range`
 */
export function readOpusHead(packet: Uint8Array): OpusHead {
  if (packet.length < 19 || ((packet[8] ?? 0) & 0xf0) !== 0) throw new Unreadable('opus-head-wrong');
  const view = new DataView(packet.buffer, packet.byteOffset, packet.byteLength);
  const channels = view.getUint8(9);
  const family = view.getUint8(18);
  if (channels < 1 || channels > MOST_CHANNELS) throw new Unreadable('channels-out-of-range');
  const head = {
    channels,
    preSkip: view.getUint16(10, true),
    inputRateHz: view.getUint32(12, true),
    gain: 10 ** (view.getInt16(16, true) / (20 * 256)),
  };
  if (family === 0) {
    if (channels > 2) throw new Unreadable('opus-head-wrong');
    return { ...head, streams: 1, coupled: channels - 1, mapping: channels === 2 ? [0, 1] : [0] };
  }
  if ((family !== 1 && family !== 255) || packet.length < 21 + channels)
    throw new Unreadable('opus-head-wrong');
  const streams = view.getUint8(19);
  const coupled = view.getUint8(20);
  const mapping = [...packet.subarray(21, 21 + channels)];
  const known = mapping.every((stream) => stream === 255 || stream < streams + coupled);
  if (streams < 1 || coupled > streams || streams + coupled > MOST_CHANNELS || !known)
    throw new Unreadable('opus-head-wrong');
  return { ...head, streams, coupled, mapping };
}

/** Opus in Ogg (RFC 7845). Lossy; always at 48 kHz, whatever the rate was before. */
export class OpusCodec implements OggCodec {
  readonly #sink: BlockSink;
  readonly #granules: Granules;
  #packets: Uint8Array[] = [];
  #tagsSeen = false;

  private constructor(
    private readonly head: OpusHead,
    private readonly decoder: OpusDecoder,
    options: DecoderOptions,
    private readonly oddities: Set<string>,
  ) {
    const format = {
      container: 'ogg' as const,
      encoding: 'opus' as const,
      lossy: true,
      sampleRateHz: RATE_HZ,
      channels: head.channels,
      bitDepth: null,
      declaredFrames: null,
      oddities: [],
      ...(head.inputRateHz > 0 ? { sourceSampleRateHz: head.inputRateHz } : {}),
    };
    this.#sink = new BlockSink(options, format, true);
    this.#granules = new Granules(head.preSkip, false);
    options.onFormat(format);
  }

  /** @throws Unreadable */
  static async create(
    packet: Uint8Array,
    options: DecoderOptions,
    oddities: Set<string>,
  ): Promise<OpusCodec> {
    const head = readOpusHead(packet);
    const decoder = new OpusDecoder({
      channels: head.channels,
      streamCount: head.streams,
      coupledStreamCount: head.coupled,
      channelMappingTable: head.mapping,
      preSkip: 0,
    });
    await decoder.ready;
    return new OpusCodec(head, decoder, options, oddities);
  }

  /** What the decoder has room for: 120 ms at 256 kbit/s a channel. */
  get mostPacketBytes(): number {
    return 3840 * this.head.channels;
  }

  packet(packet: Uint8Array | null): void {
    if (!this.#tagsSeen) this.#tagsSeen = true;
    else if (packet === null || packet.length === 0) this.oddities.add('packets-damaged');
    else this.#packets.push(packet);
  }

  pageEnd(granule: number | null, last: boolean, bytesSoFar: number): void {
    const packets = this.#packets;
    this.#packets = [];
    if (packets.length === 0) {
      this.#granules.page(0, granule, last);
      return;
    }
    const decoded = askDecoder(() => this.decoder.decodeFrames(packets));
    if (decoded.errors.length > 0) this.oddities.add('packets-damaged');
    const { from, to } = this.#granules.page(decoded.samplesDecoded, granule, last);
    if (this.head.gain !== 1)
      for (const channel of decoded.channelData)
        for (let i = from; i < to; i++) channel[i] = (channel[i] as number) * this.head.gain;
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
