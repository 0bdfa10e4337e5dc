import type { ReaderResult, Unreadable } from './types';

/** What makes sound of one logical stream's packets. */
export interface OggCodec {
  /** Longer packets are not put together, but given as null. */
  readonly mostPacketBytes: number;
  /** Every packet but the first, which the codec was made of; null: it is not whole. */
  packet(packet: Uint8Array | null): void | Promise<void>;
  /** All packets of a page were given. */
  pageEnd(granule: number | null, last: boolean, bytesSoFar: number): void | Promise<void>;
  /** The file ends within a page of this position. */
  cut(granule: number | null): void;
  end(failure: Unreadable | null): ReaderResult;
  free(): void;
}
