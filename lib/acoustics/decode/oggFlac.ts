import { FlacFrameDecoder, SLACK_BYTES } from './flacFrame';
import { readFrameHeader, readStreamInfo, STREAMINFO_BYTES, type StreamInfo } from './flacHeader';
import { FlacOutput } from './flacOutput';
import type { OggCodec } from './oggCodec';
import { type DecoderOptions, type ReaderResult, Unreadable } from './types';

/** The mapping's own head, then the marker and a block header, before STREAMINFO (RFC 9639, 10.1). */
const INFO_AT = 9 + 4 + 4;

/** FLAC in Ogg (RFC 9639, 10.1): one frame a packet. */
export class OggFlacCodec implements OggCodec {
  readonly mostPacketBytes = 4 << 20;
  readonly #info: StreamInfo;
  readonly #decoder: FlacFrameDecoder;
  readonly #output: FlacOutput;
  #granule = 0;
  #bytesSoFar = 0;
  #ended = false;

  /** @throws Unreadable */
  constructor(
    packet: Uint8Array,
    options: DecoderOptions,
    private readonly oddities: Set<string>,
  ) {
    if (packet.length < INFO_AT + STREAMINFO_BYTES || ((packet[13] ?? 0) & 0x7f) !== 0)
      throw new Unreadable('streaminfo-missing');
    this.#info = readStreamInfo(packet.subarray(INFO_AT));
    this.#decoder = new FlacFrameDecoder(this.#info);
    this.#output = new FlacOutput(options, this.#info, 'ogg');
  }

  packet(packet: Uint8Array | null): void {
    // Packets before the frames are metadata; none of them begins with the sync code.
    if (packet && packet[0] !== 0xff) return;
    if (!packet) {
      this.#output.damaged(null);
      return;
    }
    const bytes = new Uint8Array(packet.length + SLACK_BYTES);
    bytes.set(packet);
    const header = readFrameHeader(bytes, 0, packet.length, this.#info);
    if (header === null || header === 'short') {
      this.#output.damaged(null);
      return;
    }
    if (this.#decoder.decode(bytes, 0, packet.length, header) === packet.length)
      this.#output.take(header, this.#decoder, this.#bytesSoFar);
    else {
      this.#output.waste(header, this.#bytesSoFar);
      this.#output.damaged(null);
    }
  }

  pageEnd(granule: number | null, last: boolean, bytesSoFar: number): void {
    this.#bytesSoFar = bytesSoFar;
    this.#granule = Math.max(this.#granule, granule ?? 0);
    if (last) this.#ended = true;
  }

  cut(granule: number | null): void {
    this.#granule = Math.max(this.#granule, granule ?? 0);
  }

  end(failure: Unreadable | null): ReaderResult {
    if (!this.#ended) this.oddities.add('end-page-missing');
    for (const oddity of this.oddities) this.#output.oddities.add(oddity);
    const result = this.#output.end(failure);
    if (this.#info.totalFrames !== null || this.#granule === 0) return result;
    return { ...result, missingFrames: Math.max(result.missingFrames, this.#granule - result.frames) };
  }

  free(): void {}
}
